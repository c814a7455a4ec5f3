"""From change records and jobs to Qt signals."""
