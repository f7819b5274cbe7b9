"""The verdict on a relay, and the plan of a test, as text of 80 columns."""

from magion.answers.relay import RelayAnswer, RelayPlan
from magion.render.text import states_in_short, wrapped

_MOST_ROWS = 60


def relay_text(answer: RelayAnswer) -> str:
    """What a log says of a relay.

    Parameters
    ----------
    answer : RelayAnswer
        The answer.

    Returns
    -------
    str
        The verdict, then every row.
    """
    lines = [*wrapped(answer.headline, "", ""), ""]
    odds = min(abs(answer.log10_ratio), 99.0)
    side = "as labelled" if answer.log10_ratio >= 0.0 else "swapped"
    lines += wrapped(
        f"The log speaks for {side} by 10^{odds:.1f} to 1 (a verdict needs 10^2). "
        f"{answer.rows_used} of {answer.rows_read} rows speak, {answer.rows_with_rejection} of "
        "them carry the rejection."
    )
    first, second = answer.labels
    lines += ["", f"  dB are {first} less {second}; expected: as labelled", ""]
    lines.append("  line  UTC                  MHz   read  expected   waves  use")
    for row in answer.rows[:_MOST_ROWS]:
        read = "-" if row.measured_db is None else f"{row.measured_db:+.1f}"
        told = "-"
        if row.expected_db is not None and row.error_db is not None:
            told = f"{row.expected_db:+.0f} ± {row.error_db:.0f}"
        state = "-" if row.state is None else states_in_short(row.state)
        head = (
            f"  {row.line:>4}  {row.time_utc[:16].replace('T', ' ')} {row.frequency_mhz:7.3f}"
            f"{read:>7}  {told:>8}  {state:>6}  "
        )
        lines += wrapped(row.use, " " * len(head), head)
    if len(answer.rows) > _MOST_ROWS:
        lines.append(f"  ... and {len(answer.rows) - _MOST_ROWS} more: see --format csv")
    if answer.caveats:
        lines += ["", "Keep in mind"]
        for caveat in answer.caveats:
            lines += wrapped(caveat, "    ", "  - ")
    return "\n".join(lines) + "\n"


def plan_text(answer: RelayPlan) -> str:
    """When to test a relay.

    Parameters
    ----------
    answer : RelayPlan
        The answer.

    Returns
    -------
    str
        The best window, then all of them.
    """
    lines = [*wrapped(answer.headline, "", ""), ""]
    lines.append(f"  {answer.transmitter} to {answer.receiver}, {answer.date}, UTC")
    if answer.windows:
        lines += ["", "  from   to         MHz   chance  arrives  louder     expect"]
    for w in answer.windows:
        head = (
            f"  {w.start_utc[11:16]}  {w.end_utc[11:16]}  {w.frequency_mhz:8.3f}  "
            f"{100.0 * w.chance:5.0f} %  {w.hand:<7}  {w.louder[:9]:<9}  "
        )
        lines += wrapped(w.expect, " " * len(head), head)
    lines += [
        "",
        *wrapped(
            "Read both positions within a few seconds of each other, several times in a window, "
            "and log both levels; magion relay LOG.csv weighs them."
        ),
    ]
    for caveat in answer.caveats:
        lines += wrapped(caveat, "    ", "  - ")
    return "\n".join(lines) + "\n"
