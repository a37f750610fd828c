"""Does the review page of a million cells stay small, is it written soon, and does it answer at once?

    python tests/benchmarks/bench_page.py [rounds]

Sweeps 1000 × 1000 cells once. The command, in a process of its own, with figures to draw and with figures
drawn before, is measured against a process that imports what it needs and reads the same cells. In headless
Chromium: from the start of loading the file until the first chart is drawn, against a page that holds the
library and nothing else and draws an empty chart; and from a move of a limit's slider until the next frame
after the chart and the table follow, against the time that the library takes to draw the same cells anew. The
clock of a shared machine drifts: processor time is printed beside it.
"""

from __future__ import annotations

import shutil
import sys
import tempfile
from pathlib import Path
from typing import Any

from bench_sweep import scenario_text
from child import run, verdict

SIDE = 1000
MOST_BYTES, MOST_WRITE_SECONDS, MOST_OPEN_SECONDS, MOST_ANSWER_SECONDS = 12e6, 3.0, 2.0, 0.2
MOVES = 15

PORKGRID = [sys.executable, "-c", "from porkgrid.cli import main; main()"]
BARE = """
import sys
import plotly.offline
from porkgrid.survey.surveys import open_survey
survey = open_survey(sys.argv[1])
survey.plan
for name in survey.grid.data_vars:
    survey.grid[name].values
"""
LIBRARY_PAGE = """<!doctype html><meta charset="utf-8"><div id="chart"></div>
<script>{library}</script><script>
Plotly.newPlot("chart", []).then(() => requestAnimationFrame(() => {{
  performance.mark("first-chart");
  document.documentElement.dataset.ready = "0";
}}));
</script>"""
MOVE = """(number) => new Promise((done) => {
  const slider = document.querySelector('#sliders input[type="range"]');
  const counted = document.getElementById("counted").textContent;
  const started = performance.now();
  const low = Number(slider.min), high = Number(slider.max);
  slider.value = String(low + (high - low) * (0.3 + 0.03 * number));
  slider.dispatchEvent(new Event("input", { bubbles: true }));
  const look = () => {
    if (document.getElementById("counted").textContent === counted) requestAnimationFrame(look);
    else requestAnimationFrame(() => done(performance.now() - started));
  };
  requestAnimationFrame(look);
})"""
LIBRARY_ONLY = """async () => {
  const chart = document.getElementById("chart");
  const started = performance.now();
  await Plotly.redraw(chart);
  return performance.now() - started;
}"""


def time_writing(survey: Path, rounds: int) -> Path:
    """Time the command and print."""
    page = survey / "page.html"
    command = [*PORKGRID, "page", str(survey)]
    first = run(command)
    again, bare = [], []
    for _ in range(rounds):
        again.append(run(command))
        bare.append(run([sys.executable, "-c", BARE, str(survey)]))
    least, usual = (min(runs, key=lambda spent: spent.seconds) for runs in (again, bare))
    size = page.stat().st_size
    print(f"porkgrid page, {SIDE} × {SIDE} cells, best of {rounds} alternating runs")
    print(f"  size   {size / 1e6:6.2f} MB; under {MOST_BYTES / 1e6:.0f} MB: {verdict(size < MOST_BYTES)}")
    print(f"  write  {least.seconds:6.2f} s ({least.cpu_seconds:.2f} s of processor)")
    print(f"  first  {first.seconds:6.2f} s ({first.cpu_seconds:.2f} s of processor), with figures to draw")
    print(
        f"  bare   {usual.seconds:6.2f} s ({usual.cpu_seconds:.2f} s of processor) to import and read; "
        f"ratio {least.seconds / usual.seconds:.2f}×"
    )
    print(f"  under {MOST_WRITE_SECONDS:g} s: {verdict(least.seconds < MOST_WRITE_SECONDS)}")
    return page


def time_browser(page: Path, rounds: int) -> None:
    """Time opening and answering in headless Chromium and print."""
    from playwright.sync_api import sync_playwright
    from plotly.offline import get_plotlyjs

    program = shutil.which("chromium") or shutil.which("chromium-browser")
    if program is None:
        sys.exit("no Chromium here: apt-get install chromium")
    arguments = ["--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run"]
    arguments += ["--disable-background-networking", "--disable-component-update", "--disable-sync"]
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=program, args=arguments)
        alone = page.with_name("library.html")
        alone.write_text(LIBRARY_PAGE.format(library=get_plotlyjs()), encoding="utf-8")
        opened, bare_opened = [], []
        for _ in range(rounds):
            bare_opened.append(open_page(browser, alone))
            opened.append(open_page(browser, page))
        tab = opened[-1][0]
        answers, library = [], []
        for number in range(MOVES):
            answers.append(tab.evaluate(MOVE, number) / 1000.0)
            library.append(tab.evaluate(LIBRARY_ONLY) / 1000.0)
        browser.close()
    seconds, processor = min(each[1:] for each in opened)
    bare_seconds, bare_processor = min(each[1:] for each in bare_opened)
    usual = sorted(answers)[len(answers) // 2]
    bare = sorted(library)[len(library) // 2]
    print(f"headless Chromium, best of {rounds} visits, median of {MOVES} moves of a slider")
    print(f"  chart  {seconds:6.2f} s from opening the file ({processor:.2f} s of processor)")
    print(
        f"  bare   {bare_seconds:6.2f} s for the library alone ({bare_processor:.2f} s of processor); "
        f"ratio {seconds / bare_seconds:.2f}×"
    )
    print(f"  under {MOST_OPEN_SECONDS:g} s: {verdict(seconds < MOST_OPEN_SECONDS)}")
    print(f"  slider {usual * 1000:6.0f} ms to the frame that shows it; worst {max(answers) * 1000:.0f} ms")
    print(f"  bare   {bare * 1000:6.0f} ms for the library to draw the same; ratio {usual / bare:.2f}×")
    print(f"  under {MOST_ANSWER_SECONDS * 1000:.0f} ms: {verdict(usual < MOST_ANSWER_SECONDS)}")


def open_page(browser: Any, page: Path) -> tuple[Any, float, float]:
    """Open the page in a fresh context: the tab, seconds until the first chart, and processor seconds."""
    tab = browser.new_context(viewport={"width": 1400, "height": 900}).new_page()
    meter = tab.context.new_cdp_session(tab)
    meter.send("Performance.enable")
    tab.goto(page.resolve().as_uri())
    tab.wait_for_function("performance.getEntriesByName('first-chart').length > 0", timeout=120_000)
    seconds = tab.evaluate("performance.getEntriesByName('first-chart')[0].startTime") / 1000.0
    metrics = {each["name"]: each["value"] for each in meter.send("Performance.getMetrics")["metrics"]}
    tab.wait_for_function("document.documentElement.dataset.ready !== undefined", timeout=120_000)
    return tab, seconds, metrics["TaskDuration"]


def main(rounds: int = 3) -> None:
    """All of it."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        scenario = folder / "scenario.toml"
        scenario.write_text(scenario_text(SIDE))
        survey = folder / "survey"
        run([*PORKGRID, "sweep", str(scenario), "--out", str(survey)])
        time_browser(time_writing(survey, rounds), rounds)


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))
