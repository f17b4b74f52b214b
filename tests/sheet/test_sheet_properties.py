"""Whatever stands in the cells: no crash, every row accounted for, tables as their schemas say."""

import datetime

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import settings as trial
from hypothesis import strategies as st
from sheet.typed_sheets import PLAIN, balances, pack, settings, sheet_xml, table, xlsx_parts

from drystone.sheet.guard import inspect
from drystone.sheet.intake import take_in
from drystone.sheet.present import collapse
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import Broken, RawSheet
from drystone.sheet.readers import read_sheet
from drystone.tables.check import DERIVATIONS, FINDINGS, LEDGER
from drystone.tables.comparisons import COLUMNS, SCHEMA
from drystone.tables.store import conform
from drystone.tables.studies import COLUMNS as STUDY_COLUMNS
from drystone.words import arms


def refused(work):
    """Sentence of a refusal, None when the work was done; anything else is a failure."""
    try:
        work()
    except SheetProblem as problem:
        return str(problem)
    return None


ODD_TEXTS = ["", "NA", "-", "12,5", "<5", "3-5", "1e400", "nan", "yield", "Yield", "SE", "ci", "S"]
ODD_NUMBERS = [0.0, -1.0, 1.0, 0.5, 1e308, 1e-308, 95.0, 5e-324]
cells = st.one_of(
    st.sampled_from(ODD_TEXTS),
    st.sampled_from(ODD_NUMBERS),
    st.text(alphabet=st.characters(), max_size=8),
    st.integers(),
    st.floats(),
    st.booleans(),
    st.none(),
    st.dates(),
    st.datetimes(),
    st.just(datetime.timedelta(1)),
    st.sampled_from([Broken("#DIV/0!"), Broken("", unsaved=True)]),
)
headers = st.lists(st.sampled_from([*COLUMNS, "depth", "crop"]), max_size=14, unique=True)
study_rows = st.lists(
    st.fixed_dictionaries({}, optional=dict.fromkeys(STUDY_COLUMNS, cells)), max_size=4
)
configs = st.fixed_dictionaries(
    {
        "missing_n": st.sampled_from(["leave", "study minimum", "outcome median"]),
        "zero_sd": st.sampled_from(["missing", "as typed"]),
        "outcomes": st.sampled_from([{"yield": None}, {"yield": {"scale": "count"}, "b": None}]),
        "defaults": st.sampled_from([{}, {"spread_kind": "CI", "centre_kind": "median"}]),
    }
)


@st.composite
def raw_sheets(draw):
    names = list(dict.fromkeys(["study", "control_mean", "treatment_mean", *draw(headers)]))
    names += [] if "outcome" in names else ["outcome"]
    usual = st.sampled_from([PLAIN.get(name, "") for name in names])
    made = [
        {name: draw(st.one_of(cells, st.just(PLAIN.get(name, "")), usual)) for name in names}
        for _ in range(draw(st.integers(1, 6)))
    ]
    studies = draw(study_rows)
    studies = [{"study": "S", **row} for row in studies]
    return RawSheet("x.xlsx", table(made), table(studies, "studies") if studies else None)


@trial(max_examples=120, deadline=None)
@given(raw_sheets(), configs)
def test_no_cell_makes_the_intake_fail(raw, config):
    intake = take_in(raw, settings(**config))
    assert balances(intake)
    conform(intake.findings, FINDINGS)
    conform(intake.ledger, LEDGER)
    conform(intake.derivations, DERIVATIONS)
    if len(intake.usable):
        conform(intake.usable[list(COLUMNS)], SCHEMA)
    for line in collapse(intake.findings):
        assert str(line)


@trial(max_examples=40, deadline=None)
@given(raw_sheets(), configs)
def test_usable_rows_can_be_computed_with(raw, config):
    usable = take_in(raw, settings(**config)).usable
    for arm in arms.ARMS:
        assert (usable[f"{arm}_mean"] > 0).all()
        assert (usable[f"{arm}_n"] >= 1).all()
        sds = usable[f"{arm}_sd_value"]
        least = 0.0 if config["zero_sd"] == "as typed" else np.nextafter(0.0, 1.0)
        assert (sds.isna() | ((sds >= least) & np.isfinite(sds))).all()
        assert (sds.isna() == usable[f"{arm}_sd_rule"].isna()).all()


@trial(max_examples=20, deadline=None)
@given(raw_sheets(), configs)
def test_the_intake_is_the_same_again(raw, config):
    first, second = (take_in(raw, settings(**config)) for _ in range(2))
    for name in ("rows", "studies", "findings", "ledger", "derivations"):
        pd.testing.assert_frame_equal(getattr(first, name), getattr(second, name))


@trial(max_examples=20, deadline=None)
@given(raw_sheets())
def test_every_finding_points_into_the_sheet(raw):
    intake = take_in(raw, settings(outcomes={"yield": None, "b": None}))
    for finding in intake.findings.itertuples():
        assert finding.wrong
        assert finding.todo
        if finding.row_id == finding.row_id:
            assert finding.row_id in set(intake.rows["row_id"])


@trial(max_examples=200, deadline=None)
@given(st.data())
def test_damaged_workbooks_are_read_or_refused(data):
    one = '<c r="A1" t="inlineStr"><is><t>study</t></is></c><c r="B1"><v>1</v></c>'
    whole = pack(xlsx_parts(sheet_xml(f'<row r="1">{one}</row><row r="2">{one}</row>')))
    content = bytearray(whole)
    for _ in range(data.draw(st.integers(1, 4))):
        at = data.draw(st.integers(0, len(content) - 1))
        content[at] = data.draw(st.integers(0, 255))
    cut = data.draw(st.integers(0, len(content)))
    message = refused(lambda: inspect(bytes(content[: cut if cut % 2 else None]), "a.xlsx"))
    assert message is None or message.startswith("a.xlsx")


@trial(max_examples=80, deadline=None)
@given(st.text(alphabet=st.sampled_from('<>/"=cvrftsABX1209 &;#row')), st.booleans())
def test_odd_markup_is_read_or_refused(tmp_path_factory, markup, inside):
    sheet = sheet_xml(f'<row r="1"><c r="A1">{markup}</c></row>' if inside else markup)
    path = tmp_path_factory.mktemp("odd") / "a.xlsx"
    path.write_bytes(pack(xlsx_parts(sheet)))
    message = refused(lambda: read_sheet(path))
    assert message is None or "a.xlsx" in message


@trial(max_examples=80, deadline=None)
@given(st.binary(max_size=60))
def test_odd_csv_is_read_or_refused(tmp_path_factory, content):
    path = tmp_path_factory.mktemp("odd") / "a.csv"
    path.write_bytes(b"study,control_mean,treatment_mean\n" + content)
    message = refused(lambda: take_in(read_sheet(path), settings()))
    assert message is None or "a.csv" in message


def test_an_intake_cannot_be_changed_by_accident():
    intake = take_in(RawSheet("x", table([PLAIN])), settings())
    with pytest.raises(AttributeError):
        intake.moderators = ()
