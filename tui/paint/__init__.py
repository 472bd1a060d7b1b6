"""Painters: pure functions from plain data to lines of text with roles.

None of them knows Textual or the engine, so each is tested as what it is: data in, lines out.
"""
