import json

import pytest
from click.testing import CliRunner

from flicker.cli import program


def run(*arguments):
    return CliRunner().invoke(program, ["limits", *arguments])


def test_the_list_names_every_limit_with_its_clause_and_source():
    done = run()
    assert done.exit_code == 0
    for text in ("ieee1789-low-risk", "recommended practice 1", "approved 26 March 2015", "from memory", "1250 Hz"):
        assert text in " ".join(done.output.split())
    assert max(len(line) for line in done.output.splitlines()) <= 100


def test_json_on_standard_output_stands_alone():
    data = json.loads(run("--json", "-").output)
    by_id = {entry["limit"]: entry for entry in data["limits"]}
    assert by_id["eu-2019-2020-svm"]["at_most"] == 0.4
    assert by_id["california-ja8-below-200hz"]["below"] == 30.0
    assert all(entry["clause"] and entry["source"] and entry["basis"] for entry in data["limits"])
    assert by_id["ieee1789-no-effect"]["bands"][1] == {
        "from_hz": 90.0,
        "to_hz": 3000.0,
        "at_most": None,
        "at_most_per_hz": pytest.approx(1 / 30),
        "note": "printed as 0.0333 f, and as 0.08 f / 2.5 = 0.032 f; 1/30 agrees with the edge at 3000 Hz, "
        "the other is 4 % stricter",
    }


def test_a_day_shows_what_applied_then():
    done = run("eu-2019-2020-svm", "--on-date", "2024-08-31")
    assert "SVM ≤ 0.9" in done.output
    assert "0.4" not in done.output


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["ieee1789-lowrisk"], "flicker: no limit is called 'ieee1789-lowrisk'; did you mean 'ieee1789-low-risk'?\n"),
        (["--on-date", "31.8.2024"], "flicker: '31.8.2024' is no date: write it as 2024-09-01\n"),
        (["--limits-file", "nowhere.toml"], "flicker: nowhere.toml: cannot be read: No such file or directory\n"),
    ],
)
def test_wrong_words_are_answered_in_one_line(arguments, said):
    done = run(*arguments)
    assert done.exit_code == 2
    assert done.stderr == said
    assert done.stdout == ""
