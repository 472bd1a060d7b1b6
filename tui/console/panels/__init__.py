"""The console's panels: each a function from the watch to painted lines. None keeps anything."""
