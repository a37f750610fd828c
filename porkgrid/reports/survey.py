"""A survey in Python: what is on disk, and a method for each command that takes a survey."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from porkgrid.scenario import Scenario
from porkgrid.survey import surveys
from porkgrid.survey import sweep as engine
from porkgrid.survey.progress import Progress

if TYPE_CHECKING:
    import pandas as pd

    from porkgrid.reports.handoffs import HandOff
    from porkgrid.survey.compare import Comparison
    from porkgrid.survey.periodreport import PeriodReport


class Survey(surveys.Survey):
    """A finished survey folder, read as it is asked for.

    Methods are named after the commands and do what those do. `rank`, `trade`, `slip` and `compare` return
    what the commands print and write nothing; `period` writes where formats are given; `chart`, `handoff` and
    `page` write files and return where they are. Measures go by their names (`porkgrid measures` lists them),
    which end in their units; dates are of the TDB calendar. All numbers are of patched conics, except those
    of `handoff`'s check: early-phase estimates, not for flight operations.

    >>> survey = porkgrid.open_survey("surveys/tern-to-mars")
    >>> survey
    <Survey 'Tern to Mars': Earth → Mars, in 'surveys/tern-to-mars'>
    """

    def chart(
        self,
        of: str | None = None,
        lines: str | None = None,
        *,
        path: int | None = None,
        flyby: int | None = None,
        formats: Sequence[str] = ("png",),
    ) -> list[Path]:
        """Draw the chart and the limit map into the survey's folder; the files, as `porkgrid chart`.

        of: measure in colour, by default the rank measure. lines: measure in lines. path, flyby: draw the
        path or the flybys of that candidate (from 1) instead. formats: of "png", "svg", "pdf".
        RequestError for a measure that is not stored, or a candidate or flyby that is not there.

        >>> [each.name for each in survey.chart(of="c3_km2_s2", lines="tof_days", formats=["svg"])]
        ['chart-c3_km2_s2-tof_days.svg', 'limits.svg']
        """
        from porkgrid.reports.charts import write_charts

        return write_charts(self, of, lines, path, flyby, formats)

    def rank(
        self,
        by: str | None = None,
        order: str | None = None,
        keep: int | None = None,
        apart_days: float | None = None,
    ) -> pd.DataFrame:
        """Rank the allowed dates by any stored measure; a row per candidate, as `porkgrid rank`.

        order: "least" or "most". keep: most rows. apart_days: dates closer than this in every encounter are
        one window. What is None is as in the scenario. Columns as of `candidates`, at full precision.
        RequestError for a measure that is not stored.

        >>> table = survey.rank(by="c3_km2_s2", keep=2)
        >>> bool(table["c3_km2_s2"].is_monotonic_increasing), len(table)
        (True, 2)
        """
        from porkgrid.survey.candidates import rank_anew

        return rank_anew(self, by, order, keep, apart_days)[0]

    def trade(
        self, *measures: str, by: str | None = None, order: str | None = None, keep: int | None = None
    ) -> pd.DataFrame:
        """Tabulate the dates that no others beat in `by` and one or two more, as `porkgrid rank --trade`.

        by: by default the rank measure; order: "least" or "most" of it. keep: most rows, evenly spread along
        the front; by default the scenario's. RequestError for measures that cannot be traded so. The front is
        of the grid's dates; its order is that of sorting (Kung, Luccio and Preparata 1975).

        >>> front = survey.trade("tof_days", keep=4)
        >>> front["dv_total_km_s"].is_monotonic_increasing and front["tof_days"].is_monotonic_decreasing
        True
        """
        from porkgrid.survey.trade import front_table, trade_front

        front = trade_front(self, by, measures, order)
        return front_table(self, front, keep or self.scenario.rank.keep)

    def period(
        self,
        days: int = 21,
        by: str | None = None,
        hold: str = "nothing",
        gap_days: int = 0,
        keep: int = 3,
        *,
        formats: Sequence[str] = (),
    ) -> PeriodReport:
        """Find the launch periods whose worst day is best, as `porkgrid period`.

        days: length. by: measure whose worst day counts. hold: what is kept over the days, "nothing",
        "arrival" (one arrival date) or "all" (all dates but departure). gap_days: days that may be left out.
        keep: most periods. formats: with any, the days go to a CSV file and the figure into the survey's
        folder. The report has `periods`, best first, and how cost grows with length. RequestError where no
        such period exists.

        >>> best = survey.period(days=10).periods[0]
        >>> best.worst == float(best.table["dv_total_km_s"].max()), best.days
        (True, 10)
        """
        from porkgrid.survey.periodreport import report_periods

        report = report_periods(self, days, by, hold, gap_days, keep)
        if formats:
            from porkgrid.reports.periods import write_periods

            write_periods(self, report, formats)
        return report

    def slip(self, by: str | None = None, late: Sequence[int] = (1, 5, 10, 20)) -> pd.DataFrame:
        """Tabulate what leaving some days late costs each candidate, as `porkgrid slip`.

        by: measure of the cost, by default the rank measure. late: days. A row per candidate: of each number
        of days the new departure, the cost, its change and whether the day is open; then the last day that
        can be flown. RequestError for a measure that is not stored, or fewer than 1 day.

        >>> late = survey.slip(late=[5])
        >>> late["late_5_state"].iloc[0], bool(late["late_5_change"].iloc[0] >= 0.0)
        ('open', True)
        """
        from porkgrid.survey.slip import slip

        return slip(self, by, late)

    def compare(self, *others: surveys.Survey, days: int = 21, by: str | None = None) -> Comparison:
        """Lay this survey beside others and the transfers they are judged by, as `porkgrid compare`.

        days: length of the launch periods. by: measure, by default each survey's own. RequestError where a
        survey is given twice, two have no measure in common, or one does not store `by`.

        >>> for sentence in survey.compare(days=10).sentences:
        ...     assert "Tern to Mars" in sentence
        """
        from porkgrid.survey.compare import compare

        return compare([self, *others], days, by)

    def handoff(
        self, candidate: int | None = None, dates: Sequence[str] | None = None, *, fresh: bool = False
    ) -> HandOff:
        """Fly a route with all forces and write it for detailed analysis, as `porkgrid handoff`.

        candidate: number in the table (from 1), its dates let off the grid; or dates: ISO dates or date-times
        of all encounters (TDB). fresh: replace a hand-off that is there. Returns its `folder`, `files`, and
        the `report` of patched conics against point-mass gravity of Sun, planets and Moon.
        RequestError for what cannot be flown, RunError where the folder cannot be written.

        >>> made = survey.handoff(candidate=1)
        >>> made.report.converged, "sheet.pdf" in made.files
        (True, True)
        """
        from porkgrid.handoff.fullforce import full_force_check
        from porkgrid.reports.handoffs import chosen_flight, write_handoff

        flight = chosen_flight(self, candidate, None if dates is None else ",".join(dates), fresh)
        return write_handoff(self, flight, full_force_check(self.plan, flight.picked))

    def page(self, *others: surveys.Survey, out: str | Path | None = None, figures: int = 3) -> Path:
        """Write one HTML file to look at this survey, and others, in a browser; as `porkgrid page`.

        out: the file, by default page.html in the survey's folder, of several review.html. figures: how many
        candidates have their path and flybys drawn. Returns the file. Needs the extra `page`: RequestError
        where plotly is not installed, or where the surveys have no measure in common.

        >>> survey.page(figures=0).name
        'page.html'
        """
        from porkgrid.reports.pages import write_page

        folders = [self.path, *(each.path for each in others)]
        return write_page(folders, None if out is None else Path(out), figures)[1].path


def open_survey(path: str | Path) -> Survey:
    """Open a survey folder. RequestError where it is none, or is not finished.

    >>> porkgrid.open_survey("surveys/tern-to-mars").candidates.columns[:3].to_list()
    ['rank', 'departure', 'arrival']
    """
    return _with_methods(surveys.open_survey(path))


def sweep(
    scenario: Scenario,
    out: str | Path | None = None,
    workers: int | None = None,
    *,
    fresh: bool = False,
    memory_bytes: float | None = None,
    cluster: str | None = None,
    report: Callable[[Progress], None] | None = None,
) -> Survey:
    """Sweep a scenario: solve every pair of dates, rank them, and leave a survey folder.

    A sweep that was interrupted goes on where it stopped. out: the folder, by default surveys/<slug of the
    name>. workers: threads, by default one per core. fresh: start anew. memory_bytes: most memory to take.
    cluster: address of a dask scheduler for the tiles, or "local". report: called after every tile.

    Raises RequestError for a request that cannot be met, RunError where writing fails, KeyboardInterrupt
    after the tiles in hand are saved.

    >>> scenario = porkgrid.load_scenario("scenarios/tern-to-mars.toml")
    >>> survey = porkgrid.sweep(scenario, out="surveys/again")
    >>> survey.grid.sizes["departure"], survey.grid.sizes["arrival"]
    (71, 30)
    """
    return _with_methods(
        engine.sweep(
            scenario, out, workers,
            fresh=fresh, memory_bytes=memory_bytes, cluster=cluster, report=report,
        )
    )  # fmt: skip


def _with_methods(survey: surveys.Survey) -> Survey:
    return Survey(survey.path, survey.provenance)
