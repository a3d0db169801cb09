"""From a logger's file to channels on a time base."""
