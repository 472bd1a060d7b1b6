"""What the observer sees: the console, and the commands that print and end.

command    the entry point: arguments, exit status, errors on stderr
commands   one module a printing command, and the registry of them
console    the console: its screen, keys, entries, and what they show
widgets    the pieces the console is built of; they take plain data, never the engine's objects
look       palettes, colour depths, the terminal itself
"""
