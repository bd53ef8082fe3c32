"""Reports: one form a file. Each turns a `Report` into text and does nothing else; `cli` writes it.

To add one, write a file with `render(report, ...) -> str` and give it an option in `cli`.
"""
