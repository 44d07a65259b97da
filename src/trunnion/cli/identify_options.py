"""The options of `trunnion identify` that name columns and say what is known of them."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import click

_COLUMNS = (
    ("--numbers", "A,B,C", "The three columns in question."),
    ("--quaternion", "A,B,C,D", "Four columns of a quaternion."),
    ("--matrix", "A,…,I", "Nine columns of a matrix."),
    ("--known-angles", "A,B,C", "Three columns in the convention --convention of --workbook."),
    ("--gravity", "X,Y,Z", "Vertical vector in body components."),
    ("--rates", "X,Y,Z", "Body rates logged with the angles."),
)
_WORDS = (
    ("--topic", "NAME", "Series of a log."),
    ("--heading", "COLUMN", "Compass heading, deg clockwise from north."),
    ("--heading-of", "AXIS", "Body axis the heading is of; default forward."),
    ("--poses", "COLUMN", "Poses in words: 'nose up 30 deg, wings level, heading east'."),
    ("--time", "COLUMN", "Time of each sample, for rates."),
    ("--convention", "NAME", "Convention of the known angles."),
    ("--reference-axes", "X,Y,Z", "Axes of the reference frame, such as north,east,down."),
    ("--body-axes", "X,Y,Z", "Axes of the body frame, such as forward,starboard,down."),
)
_CHOICES = (
    ("--scalar", ("first", "last"), "Where the scalar of the known quaternion stands."),
    ("--maps", ("body to reference", "reference to body"), "Which way the known quaternion or matrix maps."),
    ("--order", ("rows", "columns"), "How the nine columns of the known matrix go."),
    ("--unit", ("deg", "rad"), "Unit of the known angles."),
    ("--gravity-points", ("down", "up"), "down: gravity itself; up: specific force at rest."),
    ("--rate-unit", ("deg/s", "rad/s"), "Unit of the rates; both are tried when left out."),
    ("--time-unit", ("s", "ms", "us", "ns"), "Unit of the time."),
    ("--in-question", ("numbers", "quaternion", "matrix"), "What is to be identified; default numbers."),
)


def _split(context: click.Context, parameter: click.Parameter, value: str | None) -> list[str] | None:
    return None if value is None else [part.strip() for part in value.split(",")]


def options(command: Callable[..., Any]) -> Callable[..., Any]:
    """Put all of them on a command, in the order above."""
    made = [click.option(name, metavar=shape, help=words, callback=_split) for name, shape, words in _COLUMNS]
    made += [click.option(name, metavar=shape, help=words) for name, shape, words in _WORDS]
    made += [click.option(name, type=click.Choice(values), help=words) for name, values, words in _CHOICES]
    made.append(click.option("--workbook", type=click.Path(path_type=Path), help="Workbook of the known convention."))
    made.append(click.option("--agree", is_flag=True, help="Nothing is known: hold the file's statements together."))
    for option in reversed(made):
        command = option(command)
    return command
