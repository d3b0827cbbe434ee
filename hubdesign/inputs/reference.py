"""The input reference, written from the schema: README, templates and workbook notes say the same."""

from __future__ import annotations

from hubdesign.schema import MODE_SETTINGS, SETTINGS, TABLES, Column, Setting


def default_words(spec: Column | Setting) -> str:
    """Return the default in words: ``required``, ``none``, ``0``, ``yes`` ..."""
    if isinstance(spec, Column) and spec.required:
        return "required"
    if spec.default_text:
        return spec.default_text
    if isinstance(spec.default, bool):
        yes, no = ("yes", "no") if isinstance(spec, Column) else ("true", "false")
        return yes if spec.default else no
    if isinstance(spec.default, float):
        return f"{spec.default:g}"
    if spec.default is None:
        return "none"
    return str(spec.default) or '""'


def allowed_words(spec: Column | Setting) -> str:
    """Return what is allowed, beyond the kind: the choices or the range; "" where anything is."""
    if spec.kind == "yesno":
        return "yes or no" if isinstance(spec, Column) else "true or false"
    if spec.choices:
        return " or ".join(spec.choices)
    low, high = spec.low, spec.high
    if low is None:
        return ""
    words = f"above {low:g}" if spec.low_open else f"at least {low:g}"
    if high is not None and high < 10**6:
        words = f"above {low:g}, at most {high:g}" if spec.low_open else f"{low:g} to {high:g}"
    return " or ".join([words, *(spec.alternatives if isinstance(spec, Setting) else ())])


def reference_markdown() -> str:
    """Return the reference of every table, column and setting as Markdown."""
    parts: list[str] = []
    for table in TABLES.values():
        required = "required" if table.required else "optional"
        parts.append(f"### {table.name}.csv ({required})\n\n{table.meaning}\n")
        parts.append(_rows("column", [(f"`{column.name}`", column) for column in table.columns]))
    parts.append("### settings.toml (sheet `settings`: section, setting, value)\n")
    for section in dict.fromkeys(setting.section for setting in (*SETTINGS, *MODE_SETTINGS)):
        own = [setting for setting in (*SETTINGS, *MODE_SETTINGS) if setting.section == section]
        parts.append(f"`[{section}]`\n")
        parts.append(_rows("setting", [(f"`{setting.name}`", setting) for setting in own]))
    return "\n".join(parts)


def _rows(first: str, entries: list[tuple[str, Column | Setting]]) -> str:
    lines = [f"| {first} | meaning | unit | allowed | default |", "|---|---|---|---|---|"]
    for name, spec in entries:
        cells = (name, spec.meaning, spec.unit, allowed_words(spec), default_words(spec))
        lines.append("| " + " | ".join(cell.replace("|", "\\|") for cell in cells) + " |")
    return "\n".join(lines) + "\n"
