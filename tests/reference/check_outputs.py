"""Reads what kneewise writes with programs that are not ours: a JSON-schema validator with the published schema of
SARIF and with our own schemas, a Markdown renderer (CommonMark with tables), a YAML reader. Lines and columns of the
SARIF log are counted again from the text."""

import json
import subprocess
import sys
import tempfile
from pathlib import Path

import jsonschema
import markdown_it
import yaml

ROOT = Path(__file__).resolve().parents[2]
PROGRAM = str(Path(sys.argv[1]).resolve())

HOSTILE = """hostile <b>names</b>
V1 in|put 0 5
R1 in|put a`b 1M
R2 a`b <i>x</i> 1k
D1 <i>x</i> 0 DX_*_
.model DX_*_ D
R3 µ 0 2M
X1 µ S
.subckt S p
D1 p q~{EN} DX_*_
.ends
"""
MENDED = HOSTILE.replace("1M", "1k").replace("D1 <i>x</i> 0", "D1 0 <i>x</i>")


def run(*arguments, cwd):
    done = subprocess.run([PROGRAM, *arguments], cwd=cwd, capture_output=True, check=False)
    assert done.returncode in (0, 1), (arguments, done.stderr.decode())
    return done.stdout.decode()


def validator(path):
    schema = json.loads(path.read_text())
    kind = jsonschema.validators.validator_for(schema)
    kind.check_schema(schema)
    return kind(schema)


def check(schema, text, about):
    document = json.loads(text)
    problems = [f"{list(e.absolute_path)}: {e.message}" for e in schema.iter_errors(document)]
    assert not problems, (about, problems[:5])
    return document


def regions(value):
    if isinstance(value, dict):
        if "physicalLocation" in value and "region" in value["physicalLocation"]:
            place = value["physicalLocation"]
            yield place["artifactLocation"]["uri"], place["region"]
        for inner in value.values():
            yield from regions(inner)
    elif isinstance(value, list):
        for inner in value:
            yield from regions(inner)


def cut(lines, region):
    """The text under a region of one line."""
    assert region["startLine"] == region["endLine"], region
    line = lines[region["startLine"] - 1]
    assert 1 <= region["startColumn"] <= region["endColumn"] <= len(line) + 1, (region, line)
    return line[region["startColumn"] - 1 : region["endColumn"] - 1]


def sarif(place):
    schema = validator(ROOT / "tests/program/published/sarif-2.1.0.schema.json")
    log = check(schema, run("check", "hostile.net", "--format", "sarif", cwd=place), "sarif")
    check(schema, run("check", "fixtures", "--format", "sarif", cwd=ROOT), "sarif of fixtures")
    lines = HOSTILE.split("\n")
    results = log["runs"][0]["results"]
    seen = 0
    for _, region in regions(results):
        cut(lines, region)
        seen += 1
    assert seen > 5, seen
    misread = [r for r in results if r["ruleId"] == "misread-value"]
    marked = sorted(cut(lines, r["locations"][0]["physicalLocation"]["region"]) for r in misread)
    assert marked == ["1M", "2M"], marked
    states = [r["message"]["text"] for r in results if r["ruleId"] == "diode-state"]
    assert len(states) == 2, states
    prints = [r["partialFingerprints"]["kneewise/v1"] for r in results]
    assert len(set(prints)) == len(prints)
    return len(results)


def own_schemas(place):
    grammar = ROOT / "grammar"
    check(validator(grammar / "findings.schema.json"), run("check", "hostile.net", "--format", "json", cwd=place), "f")
    compared = run("compare", "hostile.net", "mended.net", "--format", "json", cwd=place)
    document = check(validator(grammar / "comparison.schema.json"), compared, "c")
    assert document["states"] and document["findings"]["gone"], document


def rendered(text):
    """Rows of all tables as lists of plain text; no raw HTML but what folds the notes away."""
    tokens = markdown_it.MarkdownIt("commonmark").enable("table").parse(text)
    rows, raw = [], []
    for token in tokens:
        if token.type == "html_block":
            raw.append(token.content.strip())
        if token.type == "tr_open":
            rows.append([])
        if token.type == "inline":
            raw.extend(t.content for t in token.children if t.type == "html_inline")
            if rows and token.level >= 3:
                rows[-1].append("".join(t.content for t in token.children))
    allowed = ("<details><summary>", "</details>")
    assert all(line.startswith(allowed) for line in raw), raw
    return rows


def markdown(place):
    rows = rendered(run("check", "hostile.net", "--format", "markdown", cwd=place))
    text = json.dumps(rows, ensure_ascii=False)
    assert all(len(row) == 3 for row in rows), rows
    assert "misread-value" in text and "hostile.net:3" in text, text
    rows = rendered(run("compare", "hostile.net", "mended.net", "--format", "markdown", cwd=place))
    assert any(row[0] == "D1" for row in rows), rows
    assert any("in|put" in row[0] or "<i>x</i>" in row[0] for row in rows), rows
    return len(rows)


def hooks():
    listed = yaml.safe_load((ROOT / ".pre-commit-hooks.yaml").read_text())
    assert [hook["id"] for hook in listed] == ["kneewise-check", "kneewise-marks"], listed
    for hook in listed:
        assert hook["entry"].startswith("kneewise ") and hook["language"] == "rust", hook


def main():
    with tempfile.TemporaryDirectory() as name:
        place = Path(name)
        (place / "hostile.net").write_text(HOSTILE)
        (place / "mended.net").write_text(MENDED)
        results, rows = sarif(place), markdown(place)
        own_schemas(place)
        hooks()
    print(f"outputs: {results} SARIF results, {rows} table rows read by others")


main()
