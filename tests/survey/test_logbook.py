"""The log in the survey folder, and what of it the terminal hears."""

from __future__ import annotations

import re
from datetime import datetime

import pytest

from porkgrid.survey.logbook import LOG, log, logged

STAMP = r"(\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d[+-]\d{4}) (INFO|WARNING) (.*)"


def lines(folder):
    return [re.fullmatch(STAMP, line).groups() for line in (folder / LOG).read_text("utf-8").splitlines()]


def test_what_is_told_is_in_the_log_at_once_with_the_time_of_day(tmp_path):
    before = datetime.now().astimezone().replace(microsecond=0)
    with logged(tmp_path):
        log.info("%d of %d tiles → begun", 3, 12)
        ((stamp, level, text),) = lines(tmp_path)
    assert (level, text) == ("INFO", "3 of 12 tiles → begun")
    assert before <= datetime.strptime(stamp, "%Y-%m-%dT%H:%M:%S%z") <= datetime.now().astimezone()


def test_the_log_grows_from_run_to_run(tmp_path):
    for text in ("the evening", "the morning after"):
        with logged(tmp_path):
            log.info(text)
    assert [text for _, _, text in lines(tmp_path)] == ["the evening", "the morning after"]


def test_nothing_is_written_once_the_sweep_is_over_even_if_it_failed(tmp_path):
    level = log.level
    with pytest.raises(KeyError), logged(tmp_path):
        raise KeyError
    log.warning("much later")
    assert lines(tmp_path) == []
    assert log.level == level
    assert log.handlers == []


def test_the_terminal_hears_warnings_and_nothing_else(tmp_path, capsys):
    with logged(tmp_path):
        log.info("a tile is done")
        log.warning("a tile is damaged")
    outputs = capsys.readouterr()
    assert outputs.err == "porkgrid: a tile is damaged\n"
    assert outputs.out == ""
    assert [level for _, level, _ in lines(tmp_path)] == ["INFO", "WARNING"]


def test_a_log_that_cannot_be_written_stops_no_sweep(tmp_path, capsys):
    (tmp_path / LOG).symlink_to("/dev/full")  # takes nothing: the disk is full, it says
    with logged(tmp_path):
        log.info("nobody hears this")
        log.info("nor this")
    assert capsys.readouterr().err == ""
