"""The panel file is read strictly: what is wrong is one sentence and exit code 6."""

import json
import re
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from jsonschema import Draft202012Validator

from panelkit import LockedPanel, PanelkitError
from panelkit.errors import PanelFileError
from panelkit.lock import panel_bytes, parse_panel

REPOSITORY = Path(__file__).parents[2]
ARCHIVE = Path(__file__).parents[1] / "data" / "panel_files"


def refused(data):
    with pytest.raises(PanelFileError) as caught:
        parse_panel(data, "panel.json")
    error = caught.value
    assert error.exit_code == 6
    assert "\n" not in str(error)
    assert str(error).startswith("panel.json")
    return str(error)


@pytest.fixture
def data(locked):
    return locked.panel.read_bytes()


@pytest.fixture
def content(data):
    return json.loads(data)


def bytes_of(content):
    return json.dumps(content).encode()


def test_what_is_read_is_what_was_written(data):
    assert panel_bytes(parse_panel(data, "panel.json")) == data


def test_it_keeps_the_committed_schema(content):
    path = REPOSITORY / "panelkit/records/schemas/panel.json"
    Draft202012Validator(json.loads(path.read_text())).validate(content)
    assert content["panel_format"] == 1
    assert any("research" in line for line in content["cautions"])


@pytest.mark.parametrize("path", sorted(ARCHIVE.glob("*.json")), ids=lambda p: p.stem)
def test_old_versions_stay_readable(path):
    panel = LockedPanel.read(path).content
    assert panel.panel_format == 1
    assert panel.markers


def test_there_is_an_archive():
    assert list(ARCHIVE.glob("*.json"))


@pytest.mark.parametrize("share", [0.0, 0.1, 0.5, 0.9, 0.999])
def test_truncated(data, share):
    assert "JSON" in refused(data[: int(share * len(data))])


def test_edited(content):
    content["markers"][0]["coefficient"] *= 1.0000001
    assert "its hash differs" in refused(bytes_of(content))


def test_the_hash_edited(content):
    content["content_sha256"] = "0" * 64
    assert "its hash differs" in refused(bytes_of(content))


@pytest.mark.parametrize("version", [0, 2, 999, "1", 1.0, True, None, [1]])
def test_wrong_version(content, version):
    content["panel_format"] = version
    assert "version" in refused(bytes_of(content))


def test_no_version(content):
    del content["panel_format"]
    assert "panel_format" in refused(bytes_of(content))


def test_duplicate_keys(data):
    twice = data.replace(
        b'{\n  "panel_format": 1', b'{\n  "panel_format": 1,\n  "panel_format": 1', 1
    )
    assert "repeated: panel_format" in refused(twice)


@pytest.mark.parametrize(
    "number", [b"1e999", b"-1e999", b"NaN", b"Infinity", b"1" * 400]
)
def test_numbers_that_are_none(data, number):
    changed = re.sub(
        rb'"intercept": [-0-9.e]+', b'"intercept": ' + number, data, count=1
    )
    assert "number" in refused(changed)


@pytest.mark.parametrize("deep", [b"[" * 100_000, b'{"a":' * 100_000, b'[{"a":' * 20])
def test_deep_nesting(deep):
    assert "levels deep" in refused(deep)


def test_duplicate_markers(content):
    content["markers"].append(content["markers"][0])
    assert refused(bytes_of(content))  # its hash; a forger's is looked at next


def test_duplicate_markers_with_a_hash_that_fits(locked):
    from dataclasses import replace

    from panelkit.lock.panel_file import sealed

    panel = LockedPanel.read(locked.panel).content
    forged = sealed(replace(panel, markers=(*panel.markers, panel.markers[0])))
    assert "repeated markers" in refused(panel_bytes(forged))
    strange = replace(panel.steps[0], step="guess", parameters={})
    forged = sealed(replace(panel, steps=(strange,)))
    assert "unknown step guess" in refused(panel_bytes(forged))
    forged = sealed(replace(panel, markers=()))
    assert "needs markers" in refused(panel_bytes(forged))


def test_unknown_and_missing_keys(content):
    content["more"] = 1
    assert "unknown more" in refused(bytes_of(content))
    del content["more"], content["seed"]
    assert "missing seed" in refused(bytes_of(content))


@pytest.mark.parametrize("value", [None, "1", True, [], {}])
def test_a_coefficient_is_a_number(content, value):
    content["markers"][0]["coefficient"] = value
    assert "markers[0].coefficient" in refused(bytes_of(content))


@pytest.mark.parametrize("text", [b"", b"[]", b"null", b"\xff\xfe", b"{}", b'"x"'])
def test_other_files(text):
    assert refused(text)


def test_a_file_that_is_not_there(tmp_path):
    with pytest.raises(PanelFileError, match="cannot be read"):
        LockedPanel.read(tmp_path / "none.json")


@settings(
    max_examples=300,
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
@given(st.data())
def test_any_change_of_a_byte_is_noticed_or_changes_nothing(data, draw):
    """White space may change; whatever else does is refused, never a traceback."""
    at = draw.draw(st.integers(0, len(data) - 1))
    new = draw.draw(st.binary(min_size=0, max_size=4))
    changed = data[:at] + new + data[at + draw.draw(st.integers(0, 5)) :]
    caught = None
    try:
        panel = parse_panel(changed, "panel.json")
    except PanelkitError as error:
        caught = error
    if caught is None:
        assert panel_bytes(panel) == data
    else:
        assert caught.exit_code == 6
        assert "\n" not in str(caught)
