"""Reports: one form a file. Each has a function that turns a `Report` into text and does nothing else; `cli` writes.

To add one, write a file with `render(report, ...) -> str` and give it an option in `cli`.
"""
