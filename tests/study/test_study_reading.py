"""Study files: what is read from a good one, and the one line that a bad one gets."""

import re

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from scanner.errors import StudyError
from scanner.study import load_study, make_plan, parse_study

GOOD = """\
[study]
title = "Quadrupole family"
seed = 20261201

[table]
family = "radial_harmonic"
harmonic = 2
amplitude = { start = 0.0, stop = 0.12, count = 25 }

[orbits]
per_table = 1024
bounces = 8192
replicates = 8

[resources]
runner = "local"
workers = 2
"""
SWEPT = "amplitude = { start = 0.0, stop = 0.12, count = 25 }"


def changed(old: str, new: str) -> str:
    """Take the good study with one line, or part of it, replaced."""
    assert GOOD.count(old) == 1
    return GOOD.replace(old, new)


def test_a_good_study():
    study = parse_study(GOOD)
    assert (study.title, study.seed, study.family) == ("Quadrupole family", 20261201, "radial_harmonic")
    assert study.fixed == {"harmonic": 2}
    assert list(study.swept) == ["amplitude"]
    assert study.swept["amplitude"][3] == 0.015
    assert (study.orbits.per_table, study.orbits.bounces, study.orbits.replicates) == (1024, 8192, 8)
    assert (study.resources.runner, study.resources.workers) == ("local", 2)
    assert study.text == GOOD
    assert study.allow_code is False


def test_whole_numbers_are_taken_for_real_ones():
    study = parse_study(changed(SWEPT, "amplitude = 0"))
    assert repr(study.fixed["amplitude"]) == "0.0"
    assert make_plan(study).shape == ()


def test_dimensions_come_in_the_order_written():
    one = changed("harmonic = 2\n", "harmonic = { values = [2, 3] }\n")
    other = one.replace(SWEPT + "\n", "").replace("harmonic =", SWEPT + "\nharmonic =")
    assert make_plan(parse_study(one)).dims == ("harmonic", "amplitude")
    assert make_plan(parse_study(other)).dims == ("amplitude", "harmonic")


def test_resources_and_replicates_may_be_left_out():
    study = parse_study(GOOD[: GOOD.index("replicates")])
    assert study.orbits.replicates == 8
    assert (study.resources.runner, study.resources.workers) == ("local", None)


def test_resources_of_a_batch_system():
    wanted = """runner = "pbs"
account = "physics"
queue = "long"
walltime = "1-12:00:00"
memory = "1.5 GiB"
directives = ["-l place=scatter"]
setup = ["module load python", "export A='b'"]
"""
    resources = parse_study(changed('runner = "local"\n', wanted)).resources
    assert (resources.runner, resources.account, resources.queue) == ("pbs", "physics", "long")
    assert resources.memory_bytes == 3 * 2**29
    assert resources.directives == ("-l place=scatter",)
    assert resources.setup == ("module load python", "export A='b'")


def test_paths_are_relative_to_the_study(tmp_path):
    keys = 'scheduler_file = "cluster/scheduler.json"\ntls_ca = "ca.pem"\ntls_cert = "a.pem"\ntls_key = "/b.pem"'
    (tmp_path / "mine.toml").write_text(changed('"local"', f'"scheduler"\n{keys}'))
    resources = load_study(tmp_path / "mine.toml").resources
    assert resources.scheduler_file == str(tmp_path / "cluster" / "scheduler.json")
    assert (resources.tls_ca, resources.tls_cert) == (str(tmp_path / "ca.pem"), str(tmp_path / "a.pem"))
    assert resources.tls_key == "/b.pem"
    assert load_study(tmp_path / "mine.toml").folder == str(tmp_path)


def test_load_study_names_the_file(tmp_path):
    path = tmp_path / "mine.toml"
    path.write_bytes(b"\xef\xbb\xbf" + GOOD.replace("\n", "\r\n").encode())
    assert load_study(path).seed == 20261201
    path.write_text(changed("seed = 20261201", "seed = -1"))
    with pytest.raises(StudyError, match=rf"^{re.escape(str(path))}: study\.seed = -1 must be"):
        load_study(path)
    path.write_bytes(b"title = '\xff'")
    with pytest.raises(StudyError, match=r"mine\.toml is not UTF-8 text \(byte 9\); save it as UTF-8"):
        load_study(path)
    with pytest.raises(StudyError, match=r"none\.toml cannot be read: No such file or directory; give the path"):
        load_study(tmp_path / "none.toml")
    with pytest.raises(StudyError, match=r"cannot be read: Is a directory"):
        load_study(tmp_path)


BAD = [
    # The file
    ("[orbits]", "[orbits", r"not valid TOML: .* \(at line 10, column 8\); correct that line"),
    ("harmonic = 2\n", "harmonic = 2\nharmonic = 3\n", r'line 8, "harmonic = 3": a key is given twice; keep one'),
    ("{ start = 0.0,", "{ start = 0.0, start = 0.0,", r"line 8, .* a key is given twice; keep one"),
    ("[resources]", "[orbits]", r"not valid TOML: Cannot declare \('orbits',\) twice \(at line 15"),
    ("seed = 20261201", "seed = " + "[" * 5000, r"nested too deeply; write one level"),
    ("seed = 20261201", "seed = " + "1" * 5000, r"not valid TOML: .* correct that line"),
    # Keys
    ("[orbits]", "[orbit]", r"table \[orbit\] is not known: did you mean \[orbits\]\?"),
    ("[study]", "seed = 3\n[study]", r"seed = 3 is not known: it belongs in \[study\]"),
    ("[study]", "x = 3\n[study]", r"x = 3 is not known: remove it \(known: \[study\], \[table\]"),
    ("seed =", "sede =", r"study\.sede = 20261201 is not known: did you mean seed\? \(known: title, seed\)"),
    ("seed = 20261201", "bounces = 3", r"study\.bounces = 3 is not known: it belongs in \[orbits\]; move it there"),
    ("seed = 20261201", '"se\\ned" = 1', r'study\."se\\ned" = 1 is not known: did you mean seed\?'),
    ("bounces =", "bonces =", r"orbits\.bonces = 8192 is not known: did you mean bounces\?"),
    ("workers =", "worker =", r"resources\.worker = 2 is not known: did you mean workers\?"),
    ("seed = 20261201", "", r"study\.seed is missing: it must be a whole number .* add seed = 1"),
    ("bounces = 8192", "", r"orbits\.bounces is missing: it must be .* from 64 to 10000000; add bounces = 8192"),
    # Types
    ("seed = 20261201", 'seed = "3"', r'study\.seed = "3" must be a whole number .* write it without quotes'),
    ("seed = 20261201", "seed = true", r"study\.seed = true must be a whole number"),
    ("seed = 20261201", "seed = 3.0", r"study\.seed = 3\.0 must be a whole number .* write 3"),
    ("seed = 20261201", "seed = nan", r"study\.seed = nan must be a whole number"),
    ('"Quadrupole family"', "3", r"study\.title = 3 must be one line of plain text"),
    ('"Quadrupole family"', '"a\\nb"', r'study\.title = "a\\nb" must be one line of plain text'),
    ('"Quadrupole family"', '" "', r'study\.title = " " must be one line of plain text'),
    ('"Quadrupole family"', f'"{"x" * 201}"', r"study\.title = .* must be one line of plain text, up to 200"),
    ("[orbits]", "[[orbits]]", r"orbits = .* must be a table of per_table, bounces, replicates"),
    # Bounds
    ("seed = 20261201", "seed = -1", r"study\.seed = -1 must be .* raise it to 0 or more"),
    ("seed = 20261201", f"seed = {2**63}", r"study\.seed = 9223372036854775808 must be .* lower it"),
    ("bounces = 8192", "bounces = 63", r"orbits\.bounces = 63 must be .* from 64 .* raise it to 64 or more"),
    ("bounces = 8192", "bounces = 10000001", r"orbits\.bounces = 10000001 must be .* lower it to 10000000 or less"),
    ("replicates = 8", "replicates = 1", r"orbits\.replicates = 1 must be .* raise it to 2 or more"),
    ("replicates = 8", "replicates = 7", r"per_table = 1024 must be a multiple of replicates = 7; .* 1022 or 1029"),
    (
        "replicates = 8",
        "target_error = 0.0\nmost_per_table = 2048",
        r"orbits\.target_error = 0\.0 must be .* raise it to",
    ),
    (
        "replicates = 8",
        "target_error = 0.002",
        r"target_error = 0\.002 needs a bound .* add .* most_per_table = 16384$",
    ),
    (
        "replicates = 8",
        "most_per_table = 2048",
        r"most_per_table = 2048 does nothing without target_error; add .* remove",
    ),
    (
        "replicates = 8",
        "target_error = 0.002\nmost_per_table = 512",
        r"orbits\.most_per_table = 512 must be at least per_table = 1024, which is the first round; raise it",
    ),
    (
        "replicates = 8",
        "target_error = 0.002\nmost_per_table = 2050",
        r"orbits\.most_per_table = 2050 must be a multiple of replicates = 8; write most_per_table = 2048 or 2056",
    ),
    (
        "replicates = 8",
        "exponent_bounces = 16384",
        r"exponent_bounces = 16384 must be at most bounces = 8192; lower it",
    ),
    (
        "replicates = 8",
        "adaptive = false\nexponent_bounces = 2048",
        r"exponent_bounces = 2048 does nothing with adaptive = false.*; remove one of them",
    ),
    ("replicates = 8", "adaptive = 1", r"orbits\.adaptive = 1 must be true or false"),
    ("per_table = 1024", "per_table = 4", r"orbits\.per_table = 4 must be a multiple of replicates = 8; .* 8$"),
    ("per_table = 1024", "per_table = 0", r"orbits\.per_table = 0 must be .* raise it to 2 or more"),
    ("workers = 2", "workers = 0", r"resources\.workers = 0 must be .* raise it to 1 or more"),
    # The family
    ("radial_harmonic", "radial_harmonik", r'table\.family = .* is not known: did you mean "radial_harmonic"\?'),
    ("radial_harmonic", "zzz", r'table\.family = "zzz" is not known: correct it \(known: ellipse'),
    ("radial_harmonic", "mine:make", r'table\.family = "mine:make" runs code of your own: add --allow-code'),
    ("radial_harmonic", "my mod:f", r'table\.family = "my mod:f" must be module:function; correct'),
    ('"radial_harmonic"', "3", r"table\.family = 3 must be text"),
    ('family = "radial_harmonic"', "", r"table\.family is missing"),
    ("harmonic = 2\n", "", r"table\.harmonic is missing: family .* add harmonic = \.\.\. \(a whole number"),
    ("harmonic = 2\n", "harmonic = 2\nphase = 1\n", r"table\.phase = 1 is not known: remove it \(known: amplitude"),
    ("harmonic = 2\n", "harmonic = 2.0\n", r"table\.harmonic = 2\.0 must be a whole number; write 2"),
    ("harmonic = 2\n", "harmonic = true\n", r"table\.harmonic = true must be a whole number"),
    ("harmonic = 2\n", "harmonic = 0\n", r"table\.harmonic = 0 must be a whole number at least 1 .* raise it"),
    (SWEPT, "amplitude = nan", r"table\.amplitude = nan must be a number"),
    (SWEPT, "amplitude = -inf", r"table\.amplitude = -inf must be a number"),
    (SWEPT, f"amplitude = 1{'0' * 400}", r"table\.amplitude = \.\.\. must be a number"),
    (SWEPT, 'amplitude = "0.1"', r'table\.amplitude = "0\.1" must be a number .* write a number, or a range'),
    (SWEPT, "amplitude = [0.1]", r"table\.amplitude = \[0\.1\] must be .* to sweep a list write \{ values = "),
    (SWEPT, "amplitude = 1979-05-27", r"table\.amplitude = 1979-05-27 must be a number"),
    # Ranges
    (SWEPT, "amplitude = {}", r"table\.amplitude\.start is missing: it must be a finite number"),
    (SWEPT, "amplitude = { start = 0.1, stop = 0.2, count = 0 }", r"amplitude\.count = 0 must be .* raise it to 1"),
    (SWEPT, "amplitude = { start = 0.1, stop = 0.2, count = 2.0 }", r"amplitude\.count = 2\.0 must be .* write 2"),
    (SWEPT, "amplitude = { start = 0.1, stop = 0.2 }", r"amplitude\.count is missing: .* add count = 11"),
    (SWEPT, "amplitude = { start = 0.2, stop = 0.1, count = 3 }", r"amplitude\.stop = 0\.1 must be above start"),
    (SWEPT, "amplitude = { start = nan, stop = 0.1, count = 3 }", r"amplitude\.start = nan must be a finite number"),
    (SWEPT, "amplitude = { start = 0.1, stop = inf, count = 3 }", r"amplitude\.stop = inf must be a finite number"),
    (SWEPT, 'amplitude = { start = "0", stop = 0.1, count = 3 }', r'amplitude\.start = "0" must be a finite number'),
    (SWEPT, "amplitude = { start = false, stop = 0.1, count = 3 }", r"amplitude\.start = false must be a finite"),
    (SWEPT, "amplitude = { start = 0.0, stop = 99, count = 3 }", r"amplitude\.stop = 99 must be a number at least"),
    (SWEPT, "amplitude = { start = 0, stop = 1, cuont = 3 }", r"amplitude\.cuont = 3 is not known: did you mean count"),
    (
        SWEPT,
        'amplitude = { start = 0.1, stop = 1, count = 3, spacing = "logg" }',
        r'amplitude\.spacing = "logg" must be "linear" or "log"; did you mean "log"\?',
    ),
    (SWEPT, "amplitude = { start = 0, stop = 1, count = 1000001 }", r"amplitude\.count = 1000001 .* to 1000000 or"),
    (SWEPT, "amplitude = { values = [] }", r"amplitude\.values = \[\] must be a list of one or more"),
    (SWEPT, "amplitude = { values = 3 }", r"amplitude\.values = 3 must be a list of one or more"),
    (SWEPT, 'amplitude = { values = [0.1, "a"] }', r'amplitude\.values\[1\] = "a": values must be a list of'),
    (SWEPT, "amplitude = { values = [0.1, nan] }", r"amplitude\.values\[1\] = nan: values must be a list of"),
    (SWEPT, "amplitude = { values = [0.1, 0.1] }", r"amplitude\.values\[1\] = 0\.1 is there twice"),
    (SWEPT, "amplitude = { values = [0.1, 99] }", r"amplitude\.values\[1\] = 99 must be a number at least"),
    (SWEPT, "amplitude = { values = [0.1], count = 1 }", r"amplitude\.count = 1 is not known: .* \(known: values\)"),
    (
        "harmonic = 2\n" + SWEPT,
        "harmonic = { start = 1, stop = 101, count = 101 }\namplitude = { start = 0.0, stop = 1.0, count = 10000 }",
        r"table: 101 x 10000 values of harmonic, amplitude make 1010000 tables, must be at most 1000000; lower a count",
    ),
    # Resources
    ('"local"', '"slrum"', r'resources\.runner = "slrum" must be one of local, .* did you mean "slurm"\?'),
    ('"local"', '"local"\nmemory = "400MB"', r'resources\.memory = "400MB" must be a size .* at least 500MB'),
    ('"local"', '"local"\nmemory = "2"', r'resources\.memory = "2" must be a size'),
    ('"local"', '"local"\nwalltime = "12:00"', r'resources\.walltime = "12:00" must be a time like 12:00:00'),
    ('"local"', '"local"\naccount = "a b"', r'resources\.account = "a b" must be a name without spaces'),
    ('"local"', '"local"\ndirectives = "a"', r'resources\.directives = "a" must be a list of lines'),
    ('"local"', '"local"\ndirectives = ["a", 1]', r"resources\.directives\[1\] = 1: directives must be a list"),
    ('"local"', '"local"\nsetup = ["a\\nb"]', r'resources\.setup = \["a\\nb"\] must be a list of shell lines'),
    ('"local"', '"slurm"\ninterface = "a b"', r'resources\.interface = "a b" must be the name of a network interface'),
    ('"local"', '"slurm"\nhost = "a/b"', r'resources\.host = "a/b" must be the name or address of a host'),
    ('"local"', '"local"\ntls_ca = "a.pem"', r"resources\.tls_cert must be given beside the other tls keys"),
    ('"local"', '"scheduler"\nscheduler = "here"', r'resources\.scheduler = "here" must be an address like'),
    ('"local"', '"local"\nscheduler = "a:1"\nscheduler_file = "f"', r"resources\.scheduler = .* keep one of them"),
    ('runner = "local"', 'queue = "long"', r'resources\.runner must be given beside queue; add .* runner = "slurm"'),
]


@pytest.mark.parametrize(("old", "new", "message"), BAD, ids=[message[:50] for _, _, message in BAD])
def test_a_bad_study_gets_one_line(old, new, message):
    with pytest.raises(StudyError, match=message) as caught:
        parse_study(changed(old, new), "bad.toml")
    line = str(caught.value)
    assert line.startswith("bad.toml: ")
    assert line.isprintable()
    assert len(line) < 400


PIECES = st.one_of(
    st.sampled_from(
        ["nan", "-inf", "1e999", '"', "'", "[", "]", "{", "}", "=", ".", ",", "\n", "\\", "true", "0x", "-"]
    ),
    st.text(max_size=4),
    st.integers().map(str),
    st.floats().map(repr),
)


@settings(deadline=None, max_examples=400)
@given(st.integers(0, len(GOOD)), st.integers(0, 12), PIECES)
def test_a_damaged_study_is_read_or_refused_in_one_line(start, length, piece):
    text = GOOD[:start] + piece + GOOD[start + length :]
    try:
        outcome = parse_study(text).fingerprint
    except StudyError as error:
        outcome = str(error)
    assert outcome.isprintable()
