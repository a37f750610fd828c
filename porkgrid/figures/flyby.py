"""One flyby: its velocities as vectors to scale, the passage of the body to scale, and the numbers."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Circle

from porkgrid.figures.callouts import Drawing, draw_callout
from porkgrid.figures.frame import draw_made_with, draw_titles
from porkgrid.figures.key import Column
from porkgrid.figures.levels import round_step, value_text
from porkgrid.figures.marks import add_line
from porkgrid.figures.numbers import Pair, draw_list, number_text
from porkgrid.figures.passage import draw_passage
from porkgrid.figures.placement import Box, Room
from porkgrid.figures.plane import Plane, draw_arrow
from porkgrid.figures.style import BODY_PT, FAINT_INK, INK, SMALL_PT, SOFT_INK, axes_at, new_slide
from porkgrid.figures.text import put
from porkgrid.survey.pictures import FlybyPicture
