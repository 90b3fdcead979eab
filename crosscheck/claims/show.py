"""A reading as plain rows, for --show-reading: what each line was taken for, before any comparison."""

from __future__ import annotations

from crosscheck.claims.reading import Entry, Reading


def show_reading(reading: Reading) -> list[str]:
    """Rows of text: tables with their columns, the values as understood, then what was not understood."""
    out = [f"{reading.file or 'claim'}: {reading.rows} rows of results, {len(reading.entries)} values"]
    for table in reading.tables:
        case = f", case {table.case}" if table.case else ""
        out += ["", f"table {table.number} (line {table.first_line}): {_kind(table.kind)}{case}, {table.rows} rows"]
        out += [f"  {head or '(no head)'}: {taken}" for head, taken in table.columns]
    out += ["", "values", f"  {'line':>5}  {'what':<32} {'printed':>14}  unit"]
    out += [_row(e) for e in reading.entries]
    if reading.echo:
        out += ["", "the other model's own input"]
        out += [f"  {f.line:>5}  {f.what} of {f.where}: {f.value}" for f in reading.echo]
    for title, rows in (("not understood", reading.not_understood), ("not in the frame", reading.foreign)):
        if rows:
            out += ["", title, *(f"  {line:>5}  {text.strip()}  ({why})" for line, text, why in rows)]
    for title, lines in (("stated signs", [f"{q}: {s}" for q, s in reading.signs.items()]),
                         ("remarks", list(reading.notes)), ("open", list(reading.undecided))):  # fmt: skip
        if lines:
            out += ["", title, *(f"  {line}" for line in lines)]
    out += ["", "lines"]
    out += [f"  {t.line:>5}  {t.taken_for}{': ' + t.why if t.why else ''}" for t in reading.trace]
    return out


def _kind(kind: str) -> str:
    return {
        "end": "member ends", "ends": "member ends, both in a row", "span": "values along members",
        "reaction": "reactions", "displacement": "displacements", "extreme": "extremes of members",
        "": "not understood",
    }.get(kind, kind)  # fmt: skip


def _row(e: Entry) -> str:
    where = e.member or e.joint or "any"
    if e.kind == "end":
        where += f" at {e.joint}" if e.joint else f" at its {('start', 'end')[e.place or 0]}"
    if e.at is not None:
        where += f" at {e.at:g}{' L' if e.at_share else ''}"
    case = f" [{e.case or 'no case'}{f', by {e.governs}' if e.governs else ''}]" if e.case or e.governs else ""
    which = f"{e.extreme} " if e.extreme else ""
    unit = e.unit.text if e.unit else "not stated"
    return f"  {e.line:>5}  {which + e.quantity + ' ' + where + case:<32} {e.number.printed:>14}  {unit}"
