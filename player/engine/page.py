"""The tables of the manual's page on faults, made from the tables that the program itself runs by."""

from player.engine.alarms import ALARMS
from player.engine.fault_table import ROWS


def faults_table() -> str:
    """What can go wrong, as a table in Markdown."""
    lines = ["| what happens | exit | state | the operator hears | what to do |", "| --- | --- | --- | --- | --- |"]
    for row in ROWS.values():
        heard = f"“{row.told}”" if row.told else "–"
        lines.append(f"| {row.happens} | {row.exit} | {row.state or '–'} | {heard} | {row.then} |")
    return "\n".join(lines).replace("| -9 |", "| −9 |")


def alarms_table() -> str:
    """What sensed strain and supply can show, as a table in Markdown."""
    lines = ["| alarm | what is seen | does | look |", "| --- | --- | --- | --- |"]
    return "\n".join(lines + [f"| {name} | {row.seen} | {row.does} | {row.hint} |" for name, row in ALARMS.items()])
