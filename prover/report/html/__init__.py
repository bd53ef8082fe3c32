"""The report as one HTML file: no script, no network, nothing but itself.

markup    elements as text, and the escaping of everything that is not one
waves     waves on a ruler
states    state graphs of small machines
recovery  recovery time against how many states need it
sections  what a report holds, part by part
compared  what a report on two dividers holds
page      the file around it, for one divider, for several and for two compared
"""

from __future__ import annotations

from prover.report.html.page import render, render_compared, render_several

__all__ = ["render", "render_compared", "render_several"]
