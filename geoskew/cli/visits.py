"""``geoskew visits``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import console, options


@click.command("visits", epilog="Example: geoskew visits plan.toml --out visits.xlsx")
@options.scenario
@options.out_file(".csv, .xlsx, .gpkg (driving lines) or .ics (calendar)")
@options.overwrite
@options.strict
@options.common
def command(
    scenario: Path, out: Path, overwrite: bool, strict: bool, quiet: bool, verbose: bool, debug: bool
) -> None:
    """Plan of visits: which crew goes where on which day, and who cannot be reached in time.

    Ctrl-C ends the planning early and writes the best plan so far.
    """
    from geoskew.outputs.visits import require_known_ending, write_visits
    from geoskew.study.core import Study
    from geoskew.study.outfiles import require_free_with_rejected, write_rejected
    from geoskew.study.plan import plan_of

    require_known_ending(out)
    study = Study(scenario, strict=strict)
    require_free_with_rejected(study, out, overwrite=overwrite)
    with console.progress(quiet=quiet) as report:
        planned = plan_of(study, on_progress=lambda done, total: report("plan of visits", done, total))
    write_visits(out, planned.sheets)
    write_rejected(study, out)
    console.tell_rejected(study, out.parent)
    plan = planned.plan
    for note in plan.notes:
        console.say(note, quiet=quiet)
    console.say(
        f"wrote {out}: {len(plan.visits)} visits on {len(plan.days)} crew days, {plan.km:.0f} km, "
        f"{len(plan.unreached)} not reached in time ({plan.missing_crew_days} crew days missing)",
        quiet=quiet,
    )
    if plan.interrupted:
        raise KeyboardInterrupt
