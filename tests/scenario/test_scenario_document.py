"""Files and texts that are no scenario at all, or a hostile one."""

import pytest
from scenario_texts import VALUES, full_text, line_of, refusal

from twofluid.scenario import ScenarioError, parse_scenario, read_scenario
from twofluid.scenario.document import LARGEST_SIZE


def file_refusal(path):
    with pytest.raises(ScenarioError) as caught:
        read_scenario(path)
    assert caught.value.file == str(path)
    assert str(caught.value).startswith(str(path))
    return caught.value


@pytest.mark.parametrize("text", ["", "\n\n", "# only a comment\n", "---\n", "--- ~\n", "null"])
def test_empty_texts(text):
    error = refusal(text)
    assert (error.rule, error.line) == ("is empty", None)
    assert "cosmology and sampling" in error.remedy


@pytest.mark.parametrize("text", ["just words", "- a\n- b\n", "42"])
def test_texts_that_are_no_mapping(text):
    error = refusal(text)
    assert (error.rule, error.line) == ("must hold keys", 1)


@pytest.mark.parametrize(
    ("text", "line"),
    [
        ("a: [1, 2\nb: 3\n", 2),
        ("title: a\n\ttilt: 1\n", 2),
        ("title: 'open\n", 2),
        ("a: b: c\n", 1),
        ("title: a\n  b\n c: d\n", 3),
        ('title: "\\q"\n', 1),
        ("{", 1),
        ("%YAML 3.0\n---\na: 1\n", 1),
    ],
)
def test_syntax_errors_name_their_line(text, line):
    error = refusal(text)
    assert error.line == line
    assert error.rule.startswith("is not valid YAML (")
    assert str(error).isprintable()


def test_an_impossible_escape_is_a_syntax_error():
    assert "an escape names no character" in refusal('title: "\\UFFFFFFFF"\n').rule


def test_a_forbidden_character_names_its_line_and_code():
    error = refusal("title: a\n\nb: \x07\n")
    assert (error.line, error.remedy) == (3, "remove it")
    assert "code 0x7" in error.rule


def test_duplicate_keys_name_both_lines():
    error = refusal(full_text() + "title: again\n")
    assert (error.key, error.line) == ("title", len(VALUES) + 1)
    assert error.rule == "stands here twice, first in line 1"
    inner = refusal("cosmology:\n  baryon_density: 0.02\n  baryon_density: 0.03\n")
    assert (inner.key, inner.line) == ("cosmology.baryon_density", 3)


@pytest.mark.parametrize(
    ("text", "line", "rule"),
    [
        ("title: &name Saltmarsh\n", 1, "sets the anchor &name"),
        ("title: a\nprimordial: &p {tilt: 1}\n", 2, "sets the anchor &p"),
        ("title: a\nproducts: *p\n", 2, "uses the alias *p"),
        ("title: !!str 5\n", 1, "carries the tag tag:yaml.org,2002:str"),
        ("title: !!python/object/apply:os.getcwd []\n", 1, "carries the tag tag:yaml.org,2002:python/object"),
        ("title: ! a\n", 1, "carries the tag !"),
        ("title: !%0A%07 a\n", 1, "carries the tag !\\n\\x07"),
        ("!!map {title: a}\n", 1, "carries the tag"),
        ("!!str title: a\n", 1, "carries the tag"),
        ("&k title: a\n", 1, "sets the anchor &k"),
        ("? [a, b]\n: c\n", 1, "has a list or mapping as a key"),
        ("title: a\n---\ntitle: b\n", 2, "a second document starts here"),
        ("title: a\n---\n", 2, "a second document starts here"),
    ],
)
def test_yaml_beyond_plain_keys_and_values_is_refused(text, line, rule):
    error = refusal(text)
    assert error.line == line
    assert rule in error.rule
    assert error.remedy
    assert str(error).isprintable()


def test_an_alias_bomb_is_refused_at_its_first_anchor():
    layers = (f"{new}: &{new} [*{old}, *{old}]\n" for old, new in zip("abcd", "bcde", strict=True))
    bomb = "a: &a [x, x]\n" + "".join(layers)
    assert refusal(bomb).line == 1


@pytest.mark.parametrize("opening", ["[", "{a: "])
def test_deep_nesting_is_refused_without_deep_recursion(opening):
    error = refusal("title:\n  " + opening * 20_000)
    assert error.rule == "is nested deeper than 10 levels"
    assert error.line == 2


def test_merge_keys_are_unknown_keys():
    assert refusal("<<: {title: a}\n").rule == "is an unknown key"


@pytest.mark.parametrize("excess", [0, 1])
def test_the_size_limit(tmp_path, excess):
    text = full_text()
    text += "#" * (LARGEST_SIZE - len(text) + excess)
    path = tmp_path / "box.yaml"
    path.write_text(text)
    if excess:
        assert "larger than 1000000 bytes" in file_refusal(path).rule
        assert "larger than 1000000 bytes" in refusal(text).rule
    else:
        assert read_scenario(path) == parse_scenario(full_text())


def test_missing_files_and_directories(tmp_path):
    assert file_refusal(tmp_path / "none.yaml").rule == "does not exist"
    assert file_refusal(tmp_path).rule == "is a directory"
    (tmp_path / "file").write_text("")
    assert "cannot be read" in file_refusal(tmp_path / "file" / "below.yaml").rule


def test_a_name_no_system_can_open():
    with pytest.raises(ScenarioError, match="cannot be read"):
        read_scenario("a\0b.yaml")


def test_an_empty_file(tmp_path):
    path = tmp_path / "empty.yaml"
    path.write_bytes(b"")
    assert file_refusal(path).rule == "is empty"


@pytest.mark.parametrize("encoding", ["latin-1", "utf-16"])
def test_other_encodings_are_refused(tmp_path, encoding):
    path = tmp_path / "box.yaml"
    path.write_bytes(full_text({"primordial.tilt": "0.96 # ± 0.01"}).encode(encoding))
    error = file_refusal(path)
    assert (error.rule, error.remedy) == ("is not UTF-8 text", "save it as UTF-8")
    assert error.line == (line_of("primordial.tilt") if encoding == "latin-1" else 1)


@pytest.mark.parametrize("start", [b"", b"\xef\xbb\xbf"])
@pytest.mark.parametrize("end", ["\n", "\r\n"])
def test_byte_order_mark_and_line_ends_do_not_matter(tmp_path, start, end):
    path = tmp_path / "box.yaml"
    path.write_bytes(start + full_text().replace("\n", end).encode())
    assert read_scenario(path) == parse_scenario(full_text())
    path.write_bytes(start + full_text({"primordial.tilt": "7"}).replace("\n", end).encode())
    assert file_refusal(path).line == line_of("primordial.tilt")


def test_the_title_of_a_file_is_its_stem(tmp_path):
    path = tmp_path / "north marsh.v2.yaml"
    path.write_text(full_text({"title": None}))
    scenario = read_scenario(path)
    assert (scenario.title, scenario.source, scenario.assumed) == ("north marsh.v2", str(path), ("title",))


def test_errors_in_a_file_carry_its_name_and_line(tmp_path):
    path = tmp_path / "box.yaml"
    path.write_text(full_text({"cosmology.hubble_constant": "67.5"}))
    assert str(file_refusal(path)) == (
        f"{path}:3: cosmology.hubble_constant = 67.5: needs a unit; "
        "give it in km/(s Mpc) or an equivalent unit, for example 67.5 km/(s Mpc)"
    )
