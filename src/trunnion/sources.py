"""The registry of published sources that docstrings, notebooks and tests cite by id.

Keep ids short and stable. `seen` says what was read: "text" (the source itself), "abstract", or "memory".
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Source:
    """One published source: id, full reference with edition, and how much of it was seen."""

    id: str
    reference: str
    seen: str


SOURCES: dict[str, Source] = {}


def register(*sources: Source) -> None:
    """Add sources to the registry; an id is used once."""
    for source in sources:
        SOURCES[source.id] = source


register(
    Source(
        "HENDERSON-1977",
        "D. M. Henderson, Euler Angles, Quaternions, and Transformation Matrices: Working Relationships, "
        "NASA TM-74839 / JSC-12960, July 1977",
        "abstract",
    ),
    Source("DIEBEL-2006", "J. Diebel, Representing Attitude, Stanford University, 20 Oct 2006", "abstract"),
    Source(
        "WERTZ-1978",
        "J. R. Wertz (ed.), Spacecraft Attitude Determination and Control, Reidel 1978, Appendix E",
        "memory",
    ),
    Source(
        "SHUSTER-1993",
        "M. D. Shuster, A Survey of Attitude Representations, J. Astronautical Sciences 41(4), 1993",
        "memory",
    ),
    Source("NAIF-ROTATION", "NAIF, CSPICE Required Reading: Rotations (toolkit N0067)", "text"),
    Source("SOFA-2023", "IAU SOFA vector/matrix routines, issue 2023-10-11, as in ERFA 2.0.1 test program", "text"),
    Source("CCSDS-504.0-B-2", "CCSDS 504.0-B-2, Attitude Data Messages, January 2024", "text"),
    Source("ECSS-E-ST-60-10C", "ECSS-E-ST-60-10C, Control performance, 15 November 2008", "text"),
    Source("ECSS-E-ST-10-09C", "ECSS-E-ST-10-09C, Reference coordinate system, 31 July 2008", "text"),
)

register(
    Source(
        "NASA-JEOD",
        "NASA JEOD, models/utils/orientation/src/euler_angles.cc and its specification, public repository nasa/jeod",
        "text",
    ),
    Source(
        "HUYNH-2009",
        "D. Q. Huynh, Metrics for 3D Rotations: Comparison and Analysis, J. Math. Imaging Vis. 35 (2009) 155-164",
        "abstract",
    ),
    Source(
        "SHOEMAKE-1985",
        "K. Shoemake, Animating Rotation with Quaternion Curves, SIGGRAPH 1985",
        "memory",
    ),
    Source(
        "BUG-REPORTS",
        "Public bug reports about angles at and near lock, each with repository and number",
        "text",
    ),
    Source("REP-103", "REP-103, Standard Units of Measure and Coordinate Conventions, ROS, 2010 and later", "text"),
    Source("RICE-1945", "S. O. Rice, Mathematical Analysis of Random Noise, Bell System Tech. J. 24 (1945)", "memory"),
    Source(
        "CRAIG-1991",
        "J. W. Craig, A new, simple and exact result for calculating the probability of error, IEEE MILCOM 1991",
        "memory",
    ),
    Source(
        "OCE-1203",
        "Tilt readings of current profilers: dankelley/oce issues 1203 (2017) and 1800 (2021), aodn/imos-toolbox "
        "pull request 683 (2020), lkilcher/dolfyn issue 43 (2019)",
        "text",
    ),
)

register(
    Source(
        "MARKLEY-1988",
        "F. L. Markley, Attitude Determination Using Vector Observations and the Singular Value Decomposition, "
        "J. Astronautical Sciences 36(3), 1988, 245-258",
        "memory",
    ),
    Source(
        "SHUSTER-OH-1981",
        "M. D. Shuster and S. D. Oh, Three-Axis Attitude Determination from Vector Observations, "
        "J. Guidance and Control 4(1), 1981, 70-77",
        "memory",
    ),
    Source(
        "SCHAUB-JUNKINS",
        "H. Schaub and J. L. Junkins, Analytical Mechanics of Space Systems, problem 3.38, through public solutions",
        "text",
    ),
    Source(
        "PIOVAN-BULLO-2012",
        "G. Piovan and F. Bullo, On Coordinate-Free Rotation Decomposition: Euler Angles About Arbitrary Axes, "
        "IEEE Trans. Robotics 28(3), 2012, 728-733",
        "memory",
    ),
    Source("DAVENPORT-1973", "P. B. Davenport, Rotations about Nonorthogonal Axes, AIAA J. 11(6), 1973", "memory"),
    Source(
        "BORKOWSKI-1987",
        "K. M. Borkowski, Near Zenith Tracking Limits for Altitude-Azimuth Telescopes, "
        "Acta Astronomica 37, 1987, 79-88",
        "abstract",
    ),
    Source("IRAM-SCAN", "IRAM public wiki, NIKA run 3, attachment scan_speed.txt", "text"),
    Source(
        "FIELD-REPORTS",
        "Public reports on mounts and gimbals: issue threads, pull requests, press reports; each case names its own",
        "text",
    ),
)
