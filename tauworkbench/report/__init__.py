"""Tables, figures and documents from a result."""
