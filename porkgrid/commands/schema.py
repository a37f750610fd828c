"""porkgrid check --schema: what a scenario file may hold, for editors."""

from __future__ import annotations


def print_schema() -> None:
    """Print the JSON Schema of scenario files."""
    from porkgrid import terminal
    from porkgrid.scenario.schema import scenario_schema
    from porkgrid.survey.measures import all_entries

    terminal.print_json(scenario_schema(all_entries()))
