"""Tables for papers (layer 9): the same rows as CSV, Markdown or LaTeX, with numbered sources.

CSV holds the shortest exact numbers; Markdown and LaTeX print ``DIGITS`` significant digits of the same numbers.
"""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any

from benchmark.record.shown_units import NORMALISED
from benchmark.report.rows import policy_rows
from benchmark.report.section_evidence import source_numbers
from benchmark.report.tables import plain_tables
from benchmark.report.words import is_number, visible

__all__ = ["DIGITS", "FORMATS", "publication_tables", "sources_text", "write_tables"]

Record = Mapping[str, Any]
Row = dict[str, Any]
DIGITS = 4
#: table -> columns of the record's table that are published, and the caption
_TABLES: dict[str, tuple[tuple[str, ...], str]] = {
    "requirements": (
        ("requirement", "kind", "state", "demanded", "offered", "unit", "margin_factor", "met_somewhere", "note"),
        "Requirements of the candidate at the primary design point; an unknown is not a pass",
    ),
    "policies": (
        (
            *("policy", "diagnostic", "role", "side", "strongest", "state", "reason", "advantage", "supply_V", "size"),
            *("time_s", "energy_J", "leakage_power_W", "area_m2"),
        ),
        "Design points of every side under every policy; advantage above 1 favours the candidate",
    ),
    "anchors": (
        (
            *("technology", "node", "anchor", "supply_V", "published_SI", "predicted_SI", "unit_of_source"),
            *("relative_difference", "kind", "source", "where"),
        ),
        "Published values and what the models say for them",
    ),
    "ledger": (
        (
            *("owner", "name", "node", "value", "unit", "low", "high", "range_meaning", "evidence", "source", "where"),
            *("conditions", "set_by", "decisive"),
        ),
        "Every value used",
    ),
    "moves": (
        (
            *("input", "unit", "evidence", "best", "low", "high", "advantage_at_low", "advantage_at_high"),
            *("flips_below", "flips_above", "decisive"),
        ),
        "Inputs that move the result, each alone, both sides re-optimised",
    ),
    "nodes": (
        (
            *("node", "candidate_node", "advantage", "reason", "strongest_contender", "candidate_energy_J"),
            *("candidate_time_s", "candidate_supply_V", "reference_energy_J", "reference_time_s", "reference_supply_V"),
        ),
        "Primary policy at every node pair",
    ),
}
_UNITS = ("SI", "V", "s", "J", "W", "m2")


def _heading(column: str, ratios: bool) -> str:
    """Turn a column name into words with its unit, or the symbol that stands for it, in brackets."""
    head, _, tail = column.rpartition("_")
    if head and tail in _UNITS:
        if ratios:
            symbol = NORMALISED["m^2" if tail == "m2" else tail] if tail != "SI" else "published = 1"
            return f"{head.replace('_', ' ')} ({symbol})"
        return f"{head.replace('_', ' ')} ({'m^2' if tail == 'm2' else tail})"
    return column.replace("_", " ")


def publication_tables(record: Record) -> dict[str, list[Row]]:
    """Return table name -> rows with words as headings; sources by their number in ``sources.md``."""
    numbers = source_numbers(record)
    ratios = bool(record.get("ratio_only"))
    every = plain_tables(record)
    every["policies"] = policy_rows(record)
    found = {}
    for name, (columns, _) in _TABLES.items():
        rows = []
        for row in every[name]:
            cells = {_heading(column, ratios): row[column] for column in columns if column in row}
            if row.get("source"):
                key = row["source"]
                cells["source"] = f"[{numbers[key]}]" if key in numbers else key
            rows.append(cells)
        found[name] = rows
    return found


def sources_text(record: Record) -> str:
    """Return the numbered sources as Markdown; the numbers are those of the tables and of the report."""
    lines = ["# Sources", ""]
    for key, position in source_numbers(record).items():
        source = record["sources"][key]
        doi = f", doi {source['doi']}" if source["doi"] else ""
        lines.append(_markdown_text(f"[{position}] {source['citation']}{doi} ({key})") + "  ")
    return "\n".join(lines if len(lines) > 2 else [*lines, "No source is named."]) + "\n"


def _printed(value: Any) -> str:
    """Print a number with four significant digits in plain ASCII, words as they are."""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if is_number(value):
        return f"{float(f'{value:.{DIGITS - 1}e}'):.{DIGITS}g}"
    return "" if value is None else visible(str(value))


def _exact(value: Any) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    if is_number(value):
        return repr(value)
    return "" if value is None else visible(str(value))


def _csv(rows: Sequence[Row], name: str) -> str:
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    if rows:
        writer.writerow(list(rows[0]))
        writer.writerows([_exact(value) for value in row.values()] for row in rows)
    else:
        writer.writerow(["no rows"])
    return out.getvalue()


def _markdown_text(text: str) -> str:
    """Escape what Markdown or HTML inside it would read as markup."""
    flat = re.sub(r"\s+", " ", text)
    return re.sub(r"([\\`*_{}<>|#~])", r"\\\1", flat)


def _markdown(rows: Sequence[Row], name: str) -> str:
    caption = _TABLES[name][1]
    if not rows:
        return f"{caption}: no rows.\n"
    heads = list(rows[0])
    right = {head: any(is_number(row[head]) for row in rows) for head in heads}
    lines = [
        f"{caption}.",
        "",
        "| " + " | ".join(_markdown_text(head) for head in heads) + " |",
        "| " + " | ".join("---:" if right[head] else "---" for head in heads) + " |",
    ]
    lines += ["| " + " | ".join(_markdown_text(_printed(value)) for value in row.values()) + " |" for row in rows]
    return "\n".join(lines) + "\n"


_LATEX = {
    **{letter: f"\\{letter}" for letter in "&%$#_{}"},
    "\\": "\\textbackslash{}",
    "~": "\\textasciitilde{}",
    "^": "\\textasciicircum{}",
    "<": "\\textless{}",
    ">": "\\textgreater{}",
    "[": "{[}",
    "]": "{]}",
    '"': "\\textquotedbl{}",
    "µ": "$\\mu$",
    "Ω": "$\\Omega$",
    "°": "\\textdegree{}",
    "²": "$^2$",
    "³": "$^3$",
    "×": "$\\times$",
    "−": "$-$",
    "\u00a0": "~",
}


def _latex_text(text: str) -> str:
    return "".join(_LATEX.get(letter, letter) for letter in re.sub(r"\s+", " ", text))


def _latex_cell(value: Any) -> str:
    shown = _printed(value)
    if not is_number(value):
        return _latex_text(shown)
    mantissa, _, exponent = shown.partition("e")
    return f"${mantissa} \\times 10^{{{int(exponent)}}}$" if exponent else f"${mantissa}$"


def _latex(rows: Sequence[Row], name: str) -> str:
    caption = _latex_text(_TABLES[name][1])
    if not rows:
        return f"% {caption}: no rows\n"
    heads = list(rows[0])
    head = " & ".join(_latex_text(item) for item in heads) + " \\\\ \\hline"
    width = f"{0.9 / len(heads):.3f}"
    lines = [
        "% needs the package longtable; UTF-8 input",
        f"\\begin{{longtable}}{{*{{{len(heads)}}}{{p{{{width}\\textwidth}}}}}}",
        f"\\caption{{{caption}}}\\label{{tab:{name}}}\\\\ \\hline",
        f"{head} \\endfirsthead",
        f"\\hline {head} \\endhead",
    ]
    lines += [" & ".join(_latex_cell(value) for value in row.values()) + " \\\\" for row in rows]
    return "\n".join([*lines, "\\hline", "\\end{longtable}"]) + "\n"


#: format -> writer and ending of the file
FORMATS: dict[str, tuple[Callable[[Sequence[Row], str], str], str]] = {
    "csv": (_csv, "csv"),
    "md": (_markdown, "md"),
    "latex": (_latex, "tex"),
}


def write_tables(record: Record, folder: Path, form: str) -> list[str]:
    """Write every publication table in one of ``FORMATS`` and ``sources.md``; returns the file names."""
    writer, ending = FORMATS[form]
    names = []
    for name, rows in publication_tables(record).items():
        place = folder / f"{name}.{ending}"
        place.write_text(writer(rows, name), encoding="utf-8")
        names.append(place.name)
    (folder / "sources.md").write_text(sources_text(record), encoding="utf-8")
    return [*names, "sources.md"]
