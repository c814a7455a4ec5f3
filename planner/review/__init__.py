"""The open range review: undoable commands, jobs, the engine."""
