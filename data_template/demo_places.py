"""Names of the demo's invented region: studies, sites and what was measured on them.

Nothing here exists: the Skarrow Uplands, their farms, the trials and all numbers are made up. The
species are real, what is said of them is not.
"""

from __future__ import annotations

from dataclasses import dataclass

INVENTED = (
    "INVENTED EXAMPLE: the region, the places, the studies and every number in this file are made "
    "up to show drystone at work. Nothing was measured; draw no conclusion and cite nothing."
)
QUESTION = (
    "Do strips of farmland in the lee of dry-stone walls differ from open ground in forage yield "
    "and in the activity density of ground beetles?"
)

FORAGE = "forage yield"
BEETLES = "beetle activity density"


@dataclass(frozen=True)
class Outcome:
    """An outcome of the demo and the process that makes its numbers.

    ``species`` gives the open-ground mean of each species in ``unit``; ``cv`` the range of the
    true coefficients of variation; ``mean_effect``, ``per_metre`` (slope on wall height) and
    ``by_aspect`` the true log response ratios; ``decimals`` what a paper prints.
    """

    name: str
    unit: str
    decimals: int
    species: dict[str, float]
    cv: tuple[float, float]
    mean_effect: float
    per_metre: float
    by_aspect: dict[str, float]


OUTCOMES: dict[str, Outcome] = {
    FORAGE: Outcome(
        FORAGE,
        "t/ha",
        2,
        {
            "Lolium perenne": 8.2,
            "Dactylis glomerata": 7.4,
            "Festuca rubra": 4.6,
            "Trifolium repens": 5.4,
        },
        (0.15, 0.38),
        0.18,
        0.15,
        {"south": 0.04, "north": -0.04, "east or west": 0.0},
    ),
    BEETLES: Outcome(
        BEETLES,
        "individuals per trap",
        1,
        {
            "Pterostichus madidus": 14.0,
            "Nebria brevicollis": 19.0,
            "Carabus violaceus": 6.5,
            "Poecilus versicolor": 9.0,
        },
        (0.25, 0.5),
        0.05,
        0.05,
        {"south": -0.06, "north": 0.08, "east or west": 0.0},
    ),
}

ASPECTS: tuple[str, ...] = ("south", "north", "east or west")
SITES: tuple[str, ...] = ("upper intake", "lower intake", "bottom meadow", "moor edge")

# F: forage yield, B: beetles, FB: both. The year is that of publication.
_STUDIES = """
Hollin Fell 2009 FB     Wether Rigg 1994 F      Skarrow Head 2016 FB    Brackmoor 2001 F
Ravock Scar 2012 B      Cold Bield 1998 F       Thrang Moss 2005 FB     Lunn Garth 2019 F
Nettlehowe 2014 B       Gimmer Edge 1996 F      Far Intake 2021 FB      Swarth Gill 2003 F
Dunnock Lea 2010 B      Sikefold 2007 F         High Pinfold 2018 FB    Oxclose Rake 1999 F
Millstone Bank 2013 B   Tarnbeck 2006 F         Grizeholme 2022 FB      Westerclough 2000 F
Bleaberry How 2015 B    Stang End 1997 F        Kirn Barrow 2011 FB     Ling Hagg 2004 F
Fallow Reins 2017 B     Sheepwash 2008 F        Ewe Crag 2020 FB        Rushy Slack 2002 F
Hagworm Brow 2016 B     Long Stoop 1995 F       Capplestone 2023 FB     Yowden 2013 F
Throughstone 2019 B     Winter Pasture 2010 F   Blackrigg Hush 2021 B   Smoot Hole 2014 F
Lunky Gap 2018 B        Copestone 2012 F        Lathe Meadow 2023 B     Bracken Hass 2009 F
"""
_LETTERS = {"F": (FORAGE,), "B": (BEETLES,), "FB": (FORAGE, BEETLES)}


@dataclass(frozen=True)
class Study:
    """An invented study: the place it is named after, its year, the outcomes it reports."""

    place: str
    year: int
    outcomes: tuple[str, ...]

    @property
    def name(self) -> str:
        """Short name, as in both sheets."""
        return f"{self.place} {self.year}"

    @property
    def citation(self) -> str:
        """What stands for a reference."""
        return f"Invented record for the demo: {self.place} wall-strip trial, {self.year}"


def all_studies() -> tuple[Study, ...]:
    """Studies in the order of the list, which is the order in which they were 'found'."""
    words = [entry for line in _STUDIES.strip().splitlines() for entry in _entries(line)]
    return tuple(words)


def _entries(line: str) -> list[Study]:
    found, place = [], []
    for word in line.split():
        if word in _LETTERS:
            found.append(Study(" ".join(place[:-1]), int(place[-1]), _LETTERS[word]))
            place = []
        else:
            place.append(word)
    return found
