"""``geoskew cards``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import console, options


@click.command("cards", epilog="Example: geoskew cards plan.toml --out cards.pdf")
@options.scenario
@options.out_file(".html or .pdf")
@options.overwrite
@options.strict
@options.common
def command(
    scenario: Path, out: Path, overwrite: bool, strict: bool, quiet: bool, verbose: bool, debug: bool
) -> None:
    """Job cards, one page a site: what to do, how far, and which way to turn, from both standing places."""
    from geoskew.errors import InputError
    from geoskew.outputs.cards import write_cards
    from geoskew.study.core import Study
    from geoskew.study.facts import card_facts
    from geoskew.study.outfiles import require_free_with_rejected, write_rejected
    from geoskew.study.plan import can_plan, plan_of

    as_html = out.suffix.lower() == ".html"
    if not as_html and out.suffix.lower() != ".pdf":
        raise InputError(f"{out}: job cards are written as .html or .pdf; give a name with one of the two")
    study = Study(scenario, strict=strict)
    facts = card_facts(study)
    require_free_with_rejected(study, out, overwrite=overwrite)
    with console.progress(quiet=quiet) as report:
        order = None
        if can_plan(study):
            plan = plan_of(study, on_progress=lambda done, total: report("plan of visits", done, total)).plan
            if plan.interrupted:
                raise KeyboardInterrupt
            order = plan.visits
        html, pdf = (out, None) if as_html else (None, out)
        remarks = write_cards(html, pdf, study.assessed.table, facts, order=order)
    write_rejected(study, out)
    console.tell_rejected(study, out.parent)
    for remark in remarks:
        console.say(remark, quiet=quiet)
    console.say(f"wrote {out}; {study.judged}", quiet=quiet)
