"""Many results to tables: repeatability, lag against speed, decision, comparison, plan."""
