"""Study files as nobody should write them: always a study or one line, never a traceback, nothing written."""

import string
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from scanner.cli.program import run
from scanner.errors import StudyError
from scanner.study import check_limits, load_study, make_plan, parse_study

CONFIGS = [file.read_text() for file in sorted((Path(__file__).parents[2] / "configs").glob("*.toml"))]
FAMILIES = ["ellipse", "lame", "outline_file", "os:system", "a:b:c", ":", "random_harmonic", "module:function", ""]

texts = st.text(st.characters(exclude_categories=["Cs"]), max_size=30)
scalars = st.one_of(
    st.integers(-(2**70), 2**70),
    st.integers(-3, 40),
    st.floats(),
    st.booleans(),
    texts.map(lambda text: '"' + "".join(f"\\U{ord(letter):08x}" for letter in text) + '"'),
    st.sampled_from(["2026-12-01", "12:00:00", "0x10", "1e400", "-0.0", "[]", "{}", '""', "'''a\nb'''"]),
    st.sampled_from(FAMILIES).map(lambda name: f'"{name}"'),
).map(lambda value: str(value).lower() if isinstance(value, bool | float) else str(value))
ranges = st.dictionaries(
    st.sampled_from(["start", "stop", "count", "spacing", "values", "step"]),
    st.one_of(scalars, st.lists(scalars, max_size=4).map(lambda items: f"[{', '.join(items)}]")),
    max_size=4,
).map(lambda entries: "{ " + ", ".join(f"{name} = {value}" for name, value in entries.items()) + " }")
values = st.one_of(scalars, ranges, st.lists(scalars, max_size=3).map(lambda items: f"[{', '.join(items)}]"))
keys = st.one_of(
    st.sampled_from("title seed family amplitude harmonic file phase per_table bounces replicates period_max runner "
                    "workers scheduler memory walltime setup directives table orbits orbit".split()),
    st.text(string.ascii_letters + "_-.", min_size=1, max_size=8),
)  # fmt: skip
headings = st.sampled_from(["[study]", "[table]", "[orbits]", "[resonances]", "[resources]", "[[table]]", "[a.b]", "["])


@st.composite
def studies(draw):
    """A good study, a few lines of which are replaced, taken away, doubled or moved."""
    lines = draw(st.sampled_from(CONFIGS)).splitlines()
    for _ in range(draw(st.integers(1, 4))):
        place = draw(st.integers(0, len(lines) - 1))
        name = lines[place].partition("=")[0] if "=" in lines[place] else draw(keys)
        change = draw(st.sampled_from(["value", "key", "cut", "double", "heading", "junk"]))
        if change == "value":
            lines[place] = f"{name} = {draw(values)}"
        elif change == "key":
            lines.insert(place, f"{draw(keys)} = {draw(values)}")
        elif change == "cut":
            del lines[place : place + 1]
            lines = lines or [""]
        elif change == "double":
            lines.insert(draw(st.integers(0, len(lines))), lines[place])
        else:
            lines.insert(place, draw(headings if change == "heading" else texts))
    return "\n".join(lines)


def require_one_line(error: object) -> None:
    message = str(error)
    assert message
    assert "\n" not in message
    assert len(message) < 700


@pytest.fixture(scope="module")
def file(tmp_path_factory):
    return tmp_path_factory.mktemp("bytes") / "study.toml"


@given(studies())
@settings(max_examples=1500, deadline=None)
def test_a_text_is_a_study_or_one_line(text):
    try:
        plan = make_plan(parse_study(text))
        check_limits(plan)
    except StudyError as error:
        require_one_line(error)
    else:
        assert plan.table_count >= 1
        assert len(plan.tasks) >= 1


@given(st.randoms(use_true_random=False))
@settings(max_examples=500, deadline=None)
def test_a_file_of_damaged_bytes_is_a_study_or_one_line(file, chance):
    content = bytearray(chance.choice(CONFIGS).encode())
    for _ in range(chance.randint(1, 8)):
        place = chance.randrange(len(content))
        content[place : place + chance.randint(0, 3)] = chance.randbytes(chance.randint(0, 3))
    file.write_bytes(content)
    try:
        load_study(file)
    except StudyError as error:
        require_one_line(error)


@given(studies())
@settings(max_examples=150, deadline=None)
def test_the_command_refuses_in_one_line_and_writes_nothing(tmp_path_factory, text):
    try:
        parse_study(text)
    except StudyError:
        pass
    else:
        return
    folder = tmp_path_factory.mktemp("fuzz")
    (folder / "s.toml").write_text(text, encoding="utf-8")
    assert run(["sweep", str(folder / "s.toml"), "--store", str(folder / "s.zarr")]) == 2
    assert [file.name for file in folder.iterdir()] == ["s.toml"]
