"""Tokens to a syntax tree, by pyverilog's parser with the productions of `grammar`.

The parser's tables are shipped beside this file. Making them takes most of a second, reading them a few
milliseconds, and they depend on nothing but the grammar, so every machine would come to the same ones; a
test makes them afresh and compares. They carry a signature of the grammar: with another pyverilog they are
made anew in memory, and nothing is ever written. `python -m prover.verilog.parse` writes the file.
"""

from __future__ import annotations

import hashlib
import json
from pathlib import Path
from types import SimpleNamespace
from typing import Any

from ply import yacc

from prover.errors import UserError
from prover.verilog import tree
from prover.verilog.grammar import INHERITED, Grammar
from prover.verilog.names import words
from prover.verilog.source import Source, printable
from prover.verilog.tokens import Chunk, chunks, plain, tidy, tokenize

TABLES = Path(__file__).with_name("tables.json")

BEYOND = words(
    """alias assert assume bind break checker class clocking const constraint continue cover do endinterface
    endpackage export expect extern final foreach import inside interface let modport new package program
    property pure randcase rand ref sequence string struct super tagged this union virtual wildcard with within"""
)
"""Words that SystemVerilog reserves and that may be names here: where one can't stand, that is why."""

_cache: dict[str, Any] = {}


def _productions(grammar: Grammar) -> dict[str, Any]:
    own = set(vars(Grammar))
    return {
        name: getattr(grammar, name)
        for name in dir(grammar)
        if name.startswith("p_") and name != "p_error" and (name in own or name[2:] in INHERITED)
    }


def signature(grammar: Grammar) -> str:
    """A digest of all that decides the tables: productions, precedence, tokens and the table format."""
    # How a docstring is indented hangs on Python's version.
    rules = [(name, method.__doc__.split()) for name, method in sorted(_productions(grammar).items())]
    version = f"{yacc.__version__} {yacc.__tabversion__}"
    return hashlib.sha256(repr((version, grammar.precedence, grammar.tokens, rules)).encode()).hexdigest()


def make_tables(grammar: Grammar) -> dict[str, Any]:
    """The LALR tables as plain data. Raises ValueError where the grammar has a conflict nobody foresaw."""
    module = SimpleNamespace(tokens=grammar.tokens, precedence=grammar.precedence, start=grammar.start)
    module.p_error = grammar.p_error
    module.__file__ = module.__name__ = "grammar"
    for name, method in _productions(grammar).items():
        setattr(module, name, method)
    quiet = yacc.NullLogger()
    parsed = yacc.ParserReflect(vars(module), log=quiet)
    parsed.get_all()
    made = yacc.Grammar(parsed.tokens)
    for level, term in enumerate(grammar.precedence, 1):
        for name in term[1:]:
            made.set_precedence(name, term[0], level)
    # Sorted by name, not by line, so that editing the file leaves the tables alone.
    for function, method in sorted(_productions(grammar).items()):
        for file, line, name, symbols in yacc.parse_grammar(method.__doc__, function, 0):
            made.add_production(name, symbols, function, file, line)
    made.set_start(grammar.start)
    made.compute_first()
    made.compute_follow()
    table = yacc.LRGeneratedTable(made, "LALR", quiet)
    unforeseen = [c for c in table.sr_conflicts if c[1] != "ELSE"] + table.rr_conflicts
    if unforeseen or made.undefined_symbols() or made.find_unreachable():
        raise ValueError(
            f"the grammar is ambiguous or incomplete: {unforeseen[:5]}, {made.find_unreachable()}"
        )
    rows = range(len(table.lr_action))
    return {
        "signature": signature(grammar),
        "productions": [[str(p), p.name, len(p), p.func] for p in made.Productions],
        "action": [dict(sorted(table.lr_action[i].items())) for i in rows],
        "goto": [dict(sorted(table.lr_goto.get(i, {}).items())) for i in rows],
    }


def render(tables: dict[str, Any]) -> str:
    """The tables as the text of the file that is shipped; rows that occur again are written once."""
    packed: dict[str, Any] = {"signature": tables["signature"], "productions": tables["productions"]}
    for key in ("action", "goto"):
        distinct: dict[str, int] = {}
        index = [distinct.setdefault(json.dumps(row), len(distinct)) for row in tables[key]]
        packed[key] = {"index": index, "rows": [json.loads(row) for row in distinct]}
    lines = [f'"{name}": {json.dumps(value, separators=(",", ":"))}' for name, value in packed.items()]
    return "{\n" + ",\n".join(lines) + "\n}\n"


def _load_tables(grammar: Grammar) -> dict[str, Any]:
    try:
        packed = json.loads(TABLES.read_text(encoding="ascii"))
    except (OSError, ValueError):
        return make_tables(grammar)
    if packed.get("signature") != signature(grammar):
        return make_tables(grammar)
    tables: dict[str, Any] = {"productions": packed["productions"]}
    for key in ("action", "goto"):
        tables[key] = [packed[key]["rows"][i] for i in packed[key]["index"]]
    return tables


def _parser() -> Any:
    if "parser" not in _cache:
        grammar = Grammar()
        tables = _load_tables(grammar)
        table = yacc.LRTable()
        table.lr_method = "LALR"
        table.lr_productions = [
            yacc.MiniProduction(text, name, length, function, "", 0)
            for text, name, length, function in tables["productions"]
        ]
        table.lr_action = dict(enumerate(tables["action"]))
        table.lr_goto = dict(enumerate(tables["goto"]))
        table.bind_callables(_productions(grammar))
        _cache["parser"] = (yacc.LRParser(table, _syntax_error), grammar.lexer)
    return _cache["parser"]


class _SyntaxError(Exception):
    """Carries the token that can't stand where it does; None is the end of the text."""

    def __init__(self, token: Any) -> None:
        super().__init__()
        self.token = token


def _syntax_error(token: Any) -> None:
    raise _SyntaxError(token)


def read_chunks(source: Source, notes: list[tuple[str, int]]) -> list[Chunk]:
    """The modules and primitives of the text, not yet parsed. Notes are pairs of message and offset."""
    return chunks(source, tokenize(source, notes))


def parse_chunk(source: Source, chunk: Chunk) -> tree.Module | tree.Primitive:
    """The syntax tree of one module or primitive; raises UserError at the first thing that is no Verilog."""
    try:
        return _parse(tidy(source, chunk.tokens))
    except _SyntaxError as error:
        first = error
    # A word that only SystemVerilog reserves may be a name here.
    simpler = plain(chunk.tokens)
    if [t.type for t in simpler] != [t.type for t in chunk.tokens]:
        try:
            return _parse(tidy(source, simpler))
        except _SyntaxError:
            pass
    raise _explain(source, chunk, first.token)


def _parse(tokens: list[Any]) -> tree.Module | tree.Primitive:
    parser, lexer = _parser()
    parsed: tree.Module | tree.Primitive = parser.parse(tokens, lexer=lexer, tracking=True)
    return parsed


def _explain(source: Source, chunk: Chunk, token: Any) -> UserError:
    if token is None:
        return UserError(
            "the text ends too early", source.where(chunk.tokens[-1].lineno), "is an end missing?"
        )
    where, shown = source.where(token.lineno), printable(str(token.value))
    if token.type == "RESERVED":
        return UserError(f"{shown} isn't supported", where, "write the divider without it")
    hints = {
        "REFUSED": "&&& belongs to SystemVerilog patterns and timing checks; write && or &",
    }
    at = chunk.tokens.index(token) if token in chunk.tokens else 0
    before = chunk.tokens[at - 1] if at else None
    if token.type == "ID" and shown in BEYOND:
        return UserError(f"{shown} isn't supported", where, "write it in Verilog, without this SystemVerilog")
    if token.type == "TICK":
        return UserError("an assignment pattern isn't supported", where, "write '0, or {a, b} with sizes")
    hint = hints.get(token.type, "")
    if not hint and before is not None:
        hint = f"this can't follow {printable(str(before.value))!r}"
        if before.type == "BASED" and str(before.value).endswith("?"):
            hint = "a ? right after a based number is one of its digits; put a space between"
    return UserError(f"syntax error at {shown!r}", where, hint)


if __name__ == "__main__":
    TABLES.write_text(render(make_tables(Grammar())), encoding="ascii")
