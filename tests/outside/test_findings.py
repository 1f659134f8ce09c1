"""The documents of a run's findings, each read by a library outside the project: `findings.json` against its JSON Schema
(jsonschema), `review.md` as CommonMark (markdown-it), `findings.csv` (csv of Python, RFC 4180), `findings.gbr`
(gerbonara)."""

import csv
import json
import math
from urllib.parse import unquote

import gerbonara
import jsonschema
import pytest
from conftest import ROOT
from markdown_it import MarkdownIt

SMALL = ROOT / "samples" / "tide-gauge" / "small" / "review.toml"
LIMITS = '\n[limits]\nextra_inductance = "0.2nH"\n[[limits.path]]\nname = "ADC_*"\nextra_path = "2mm"\n'


@pytest.fixture(scope="module")
def checked(ebbmap, tmp_path_factory):
    """A run with pictures and with limits so tight that something is found."""
    folder = tmp_path_factory.mktemp("findings")
    review = folder / "review.toml"
    fab = SMALL.parent / "fab"
    text = SMALL.read_text().replace('files = "fab"', f'files = "{fab}"')
    review.write_text(text + LIMITS)
    ebbmap.run("draw", review, "--out", folder / "out", "--cell", "0.4mm", "--only", "ADC_*", exits=(0, 3))
    return folder / "out"


def test_json_follows_its_schema(ebbmap, checked):
    schema = json.loads(ebbmap.run("check", "--schema").stdout)
    jsonschema.Draft202012Validator.check_schema(schema)
    document = json.loads((checked / "findings.json").read_text())
    jsonschema.Draft202012Validator(schema).validate(document)
    assert document["findings"] and document["maps"] and document["transfer"]
    # the schema is strict: what it does not name is refused
    document["findings"][0]["colour"] = "red"
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.Draft202012Validator(schema).validate(document)


def test_table_has_the_right_types(checked):
    findings = json.loads((checked / "findings.json").read_text())["findings"]
    text = (checked / "findings.csv").read_bytes().decode()
    assert text.count("\r\n") == text.count("\n")
    rows = list(csv.DictReader(text.splitlines()))
    assert [row["number"] for row in rows] == [finding["number"] for finding in findings]
    for row, finding in zip(rows, findings):
        assert None not in row and None not in row.values()
        assert row["severity"] in {"fail", "warn", "note"} and row["code"] == finding["code"]
        assert row["path"] == finding["path"] and row["text"] == finding["text"]
        for column, value in [("value", finding["figure"]["value"]), ("error", finding["figure"]["error"])]:
            assert float(row[column]) == value
        assert float(row["x_mm"]) == finding["place"]["x_mm"] and float(row["y_mm"]) == finding["place"]["y_mm"]
        assert row["limit"] == "" or float(row["limit"]) == finding["figure"]["limit"]


def test_text_is_commonmark_and_its_links_resolve(checked):
    tokens = MarkdownIt("commonmark").parse((checked / "review.md").read_text())
    headings = [tokens[i + 1] for i, token in enumerate(tokens) if token.type == "heading_open"]
    findings = json.loads((checked / "findings.json").read_text())["findings"]
    titled = [heading.content.split(" ")[0] for heading in headings if heading.content[0].isdigit()]
    assert sorted(titled) == sorted(finding["number"] for finding in findings)
    links = []
    for token in tokens:
        for child in token.children or []:
            assert child.type not in {"html_inline", "html_block"}
            links += [child.attrs[key] for key in ("href", "src") if key in child.attrs]
    assert any(link.startswith("maps/") for link in links) and "contact-sheet-1.svg" in links
    for link in links:
        assert (checked / unquote(link)).is_file(), link
    # names that look like markup arrive as they are
    inline = [child.content for token in tokens for child in token.children or [] if child.type == "code_inline"]
    assert "ADC_SCK" in inline


def test_marks_lie_at_the_findings(checked):
    document = json.loads((checked / "findings.json").read_text())
    layer = gerbonara.GerberFile.open(checked / "findings.gbr")
    assert layer.file_attrs[".FileFunction"][0] == "Other"
    arcs = [item for item in layer.objects if isinstance(item, gerbonara.graphic_objects.Arc)]
    centres = {(round(arc.x1 + arc.cx, 3), round(arc.y1 + arc.cy, 3)) for arc in arcs}
    assert len(arcs) == len(document["findings"])
    for finding in document["findings"]:
        place = finding["place"]
        near = [c for c in centres if math.dist(c, (place["x_mm"], place["y_mm"])) < 0.01]
        assert near, f"no ring at {place}"
    for arc in arcs:
        assert math.isclose(math.hypot(arc.cx, arc.cy), 1.5, abs_tol=1e-3)
    contours = [item for item in layer.objects if getattr(item.aperture, "diameter", 1) == 0.05]
    assert contours, "no contour"


def test_exit_code_follows_the_limits(ebbmap, tmp_path):
    fab = SMALL.parent / "fab"
    head = f'schema = 1\n[board]\nfiles = "{fab}"\nrevision = "A"\n[reference]\nnets = ["GND"]\n'
    net = '[[net]]\nname = "ADC_SCK"\ndriver = "U2.3"\nreceiver = "U1.14"\n[[band]]\nname = "HF"\n'
    review = tmp_path / "review.toml"

    def check(limits):
        review.write_text(head + net + limits)
        done = ebbmap.run("check", review, "--cell", "0.4mm", exits=(0, 1))
        return done.returncode, done.stdout, done.stderr

    loose = '[limits]\nextra_inductance = "1uH"\nextra_path = "1cm"\nshare_drop = 1.0\nedge_density = 100\nstray = 1.0\n'
    tight = '[limits]\nextra_inductance = "1pH"\n'
    assert check(loose)[0] == 0
    code, text, _ = check(tight)
    assert code == 1 and "[return-detour]" in text
    waiver = '[[waiver]]\ncode = "{}"\npath = "ADC_*"\nreason = "measured"\nexpires = "{}"\n'
    codes = {line.split("[")[1].split("]")[0] for line in text.splitlines() if line.startswith("fail")}
    waived = "".join(waiver.format(found, "B") for found in sorted(codes))
    code, text, _ = check(tight + waived)
    assert code == 0 and "waived" in text
    expired = "".join(waiver.format(found, "A") for found in sorted(codes))
    code, _, said = check(tight + expired)
    assert code == 1 and "waiver-expired" in said
