"""Hostile input: every refusal is plain sentences with the right status, nothing is dropped, nothing acts."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from tests.asking import ask, is_plain_refusal, widest

STEP = "CCC(C)Br.[Na+].[N-]=[N+]=[N-]>>CCC(C)N=[N+]=[N-]"
ESCAPES = "\x1b[31mred\x1b[0m \x1b]0;title\x07 \x9b31m \u202eevil\u2066 \u2028 [red]markup[/red] =cmd|'/C'!A1 <b>🙂</b>"

BAD_SCHEMES = {
    "open ring": "C1CC",
    "too many bonds": "C(C)(C)(C)(C)C",
    "not aromatic": "c1cccc1",
    "bad nitrogen": "C[N+](C)(C)(C)C",
    "open bracket": "CC(=O",
    "one arrow": "CC>CC",
    "three arrows": "CC>>>CC",
    "two schemes": "CCBr>>CCO>>CCN",
    "no left side": ">>CC",
    "bad right side": "CCBr>>C1CC",
    "extra dot": "CCBr..CCO>>CCO",
    "R-group by name": "[R1]CBr",
    "InChI": "InChI=1S/CH4/h1H4",
    "words": "hello world",
    "markup": "[red]CCBr[/red]",
    "escape": "\x1b[31mCCBr",
    "direction mark": "CCBr\u202e",
    "NUL": "CC\x00Br",
    "surrogate": "CC\udcffBr",
    "emoji": "🙂",
    "letters of another script": "ССВг",
    "parentheses": "(" * 3000,
    "brackets": "[" * 3000,
    "missing file": "nowhere.rxn",
    "10 kB": "C" * 10_000,
    "60 kB": "CCBr." * 10 + "C" * 60_000,
    "10 kB product": "CCBr>>" + "CO" * 5_000,
}
ODD_SCHEMES = {
    "radical": "[CH3].CCBr",
    "isotopes": "[13CH3]CBr.[N-]=[N+]=[N-]>>[13CH3]CN=[N+]=[N-]",
    "metal": "[Pd].CCBr",
    "metallocene": "[Fe+2].C1=CC=C[CH-]1.CCBr",
    "attachment point": "*CBr",
    "mapped attachment": "[*:1]CBr>>[*:1]CN",
    "deuterium": "[2H]C([2H])([2H])I",
    "hexafluorophosphate": "F[P-](F)(F)(F)(F)F.CCBr",
    "400 atoms": "C" * 399 + "Br",
    "soup of 300": ".".join(["CCBr"] * 300),
    "nothing happens": "CCBr>>CCBr",
    "CXSMILES": "CCBr |^1:0|",
}


@pytest.mark.parametrize("command", ["read", "check", "record"])
@pytest.mark.parametrize("scheme", BAD_SCHEMES.values(), ids=BAD_SCHEMES.keys())
def test_a_scheme_that_is_none_is_refused(own_book: Path, command: str, scheme: str) -> None:
    answer = ask(command, "--", scheme, book=own_book)
    assert answer.status == 1 and is_plain_refusal(answer)
    assert answer.out == ""
    if command == "record":
        assert ask("runs", "--json", book=own_book).json["total"] == 3


@pytest.mark.parametrize("scheme", ODD_SCHEMES.values(), ids=ODD_SCHEMES.keys())
def test_an_odd_scheme_is_answered(own_book: Path, scheme: str) -> None:
    for words in (("read", scheme), ("check", scheme, "--acid", "TFA", "--temp", "rt"), ("record", scheme)):
        answer = ask(*words, "--json", book=own_book)
        assert answer.status == 0, answer.err
        assert answer.json
    kept = ask("show", "4", "--json", book=own_book).json
    assert kept["scheme"] == scheme


BAD_VALUES = [
    ("--with", "NaN3=-1"),
    ("--with", "NaN3=abc"),
    ("--with", "NaN3="),
    ("--with", "frobnicate"),
    ("--with", "sodum azide"),
    ("--with", "x" * 100_000),
    ("--with", "CC(=O"),
    ("--with", "\x1b[31m"),
    ("--base", "K2CO3=1e400"),
    ("--base", "K2CO3=nan"),
    ("--acid", "TFA=-5 mL"),
    ("--add", "🙂"),
    ("--solvent", "DMF:-1"),
    ("--solvent", "xyzzy"),
    ("--solvent", "DMF:1:2"),
    ("--temp", "-300C"),
    ("--temp", "-1 K"),
    ("--temp", "-460 F"),
    ("--temp", "1e9 C"),
    ("--temp", "hot"),
    ("--temp", "60C to"),
    ("--temp", "\x1b[31m"),
    ("--time", "-4 h"),
    ("--time", "forever"),
    ("--time", "4"),
    ("--time", "1e300 h"),
    ("--conc", "-1 M"),
    ("--conc", "0.2"),
    ("--conc", "inf M"),
    ("--scale", "-5 mmol"),
    ("--scale", "5"),
]


@pytest.mark.parametrize("command", ["check", "record"])
@pytest.mark.parametrize(("flag", "value"), BAD_VALUES, ids=[f"{f} {ascii(v)[:20]}" for f, v in BAD_VALUES])
def test_a_condition_that_cannot_be_is_refused(small_book: Path, command: str, flag: str, value: str) -> None:
    answer = ask(command, STEP, flag, value, book=small_book)
    assert answer.status == 1 and is_plain_refusal(answer)
    assert answer.out == ""


FLAGS = ("--with", "--base", "--acid", "--add", "--solvent", "--temp", "--time", "--conc", "--scale", "--atmosphere")


@pytest.mark.parametrize("flag", FLAGS)
@pytest.mark.parametrize("value", ["", "  "])
def test_an_empty_value_is_refused_since_it_would_drop_something(small_book: Path, flag: str, value: str) -> None:
    answer = ask("check", STEP, flag, value, book=small_book)
    assert answer.status == 1 and is_plain_refusal(answer)
    assert f"{flag} is empty" in answer.err


BAD_OUTCOMES = [
    ("--split", "substitution"),
    ("--split", "substitution=abc"),
    ("--split", "substitutoin=80"),
    ("--split", "substitution=-5"),
    ("--split", "substitution=150"),
    ("--yield", "300"),
    ("--yield", "-1"),
    ("--yield", "lots"),
    ("--ee", "101"),
    ("--conversion", "nan"),
    ("--product", "C1CC=10"),
    ("--product", "=10"),
    ("--failed", "zzz"),
    ("--date", "yesterday"),
    ("--date", "2024-13-45"),
    ("--date", "2999-01-01"),
    ("--date", "0001-01-01"),
    ("--date", "01/02/2024"),
    ("--note", "a\x00b"),
    ("--note", "a\ud800b"),
    ("--ref", "a\x00b"),
]


@pytest.mark.parametrize(("flag", "value"), BAD_OUTCOMES, ids=[f"{f} {ascii(v)[:20]}" for f, v in BAD_OUTCOMES])
def test_an_outcome_that_cannot_be_is_refused_and_nothing_is_stored(small_book: Path, flag: str, value: str) -> None:
    answer = ask("record", STEP, flag, value, book=small_book)
    assert answer.status == 1 and is_plain_refusal(answer)
    assert ask("runs", "--json", book=small_book).json["total"] == 3


BAD_RUNS = {
    "nothing": "",
    "empty object": "{}",
    "empty list": "[]",
    "null": "null",
    "number": "1",
    "text": '"x"',
    "binary": "\x00\x01\x02",
    "cut": '{"scheme":"CCBr>>CCO"',
    "deep list": "[" * 100_000,
    "deep object": '{"a":' * 100_000,
    "long number": '{"scheme":"CCBr>>CCO","note":' + "1" * 5000 + "}",
    "NaN": '{"scheme":"CCBr>>CCO","conditions":{"conc_molar":NaN}}',
    "infinity": '{"scheme":"CCBr>>CCO","conditions":{"conc_molar":1e999}}',
    "negative": '{"scheme":"CCBr>>CCO","conditions":{"conc_molar":-1}}',
    "below 0 K": '{"scheme":"CCBr>>CCO","conditions":{"temperature":{"text":"x","start_c":-400}}}',
    "key twice": '{"scheme":"CCBr>>CCO","scheme":"CCI>>CCO"}',
    "unknown key": '{"scheme":"CCBr>>CCO","foo":1}',
    "no scheme": '{"scheme":""}',
    "bad scheme": '{"scheme":"C1CC>>C"}',
    "number for text": '{"scheme":1}',
    "list for object": '{"scheme":"CCBr>>CCO","conditions":[]}',
    "bad fate": '{"scheme":"CCBr>>CCO","outcome":{"products":[{"fate":"x"}]}}',
    "share over 1": '{"scheme":"CCBr>>CCO","outcome":{"products":[{"fate":"elimination","share":3}]}}',
    "bad mode": '{"scheme":"CCBr>>CCO","outcome":{"failures":[{"mode":"zz"}]}}',
    "bad motif": '{"scheme":"CCBr>>CCO","outcome":{"failures":[{"mode":"elimination","motif":"[C"}]}}',
    "bad UUID": '{"scheme":"CCBr>>CCO","run_id":"x"}',
    "later form": '{"scheme":"CCBr>>CCO","sidepath_run":99}',
    "bad date": '{"scheme":"CCBr>>CCO","date":"x"}',
    "future": '{"scheme":"CCBr>>CCO","date":"2999-01-01"}',
    "bad moment": '{"scheme":"CCBr>>CCO","recorded_at":"2024"}',
    "NUL": '{"scheme":"CCBr>>CCO","note":"\\u0000"}',
    "surrogate": '{"scheme":"CCBr>>CCO","note":"a\\ud800"}',
    "two on a line": '{"scheme":"CCBr>>CCO"} {"scheme":"CCBr>>CCO"}',
    "bad second line": '{"scheme":"CCBr>>CCO"}\n{nope}\n',
}


@pytest.mark.parametrize("text", BAD_RUNS.values(), ids=BAD_RUNS.keys())
def test_a_run_in_json_that_is_none_is_refused_and_nothing_is_stored(small_book: Path, text: str) -> None:
    answer = ask("record", "--from", "-", book=small_book, stdin=text)
    assert answer.status == 1 and is_plain_refusal(answer)
    assert ask("runs", "--json", book=small_book).json["total"] == 3


@pytest.mark.parametrize("name", ["nowhere.json", "."])
def test_a_run_file_that_cannot_be_read_is_refused(small_book: Path, name: str) -> None:
    answer = ask("record", "--from", name, book=small_book)
    assert answer.status == 1 and is_plain_refusal(answer)


def test_a_binary_run_file_is_refused(small_book: Path, tmp_path: Path) -> None:
    (tmp_path / "run.json").write_bytes(bytes(range(256)))
    assert ask("record", "--from", str(tmp_path / "run.json"), book=small_book).status == 1


def test_hostile_text_is_kept_to_the_letter_and_shown_tame(own_book: Path) -> None:
    words = ("--note", ESCAPES, "--ref", ESCAPES, "--project", ESCAPES, "--atmosphere", ESCAPES, "--as", "AB")
    said = [ask("record", STEP, *words, book=own_book)]
    assert said[0].status == 0
    said += [ask(*more, book=own_book) for more in (("show", "4"), ("show", "4", "--json"), ("runs",), ("find",))]
    said.append(ask("amend", "4", "--set", f"note={ESCAPES}!", "--why", ESCAPES, book=own_book))
    said += [ask(*more, book=own_book) for more in (("history", "4"), ("history", "4", "--json"), ("check", STEP))]
    for answer in said:
        assert answer.status == 0
        for text in (answer.out, answer.err):
            assert not {"\x1b", "\x07", "\x9b", "\u202e", "\u2066", "\u2028"} & set(text)
    kept = ask("show", "4", "--json", book=own_book).json
    assert (kept["note"], kept["reference"], kept["conditions"]["atmosphere"]) == (ESCAPES + "!", ESCAPES, ESCAPES)
    assert ask("history", "4", "--json", book=own_book).json["history"][-1]["why"] == ESCAPES


def test_a_long_note_is_kept_whole_and_shown_short(own_book: Path) -> None:
    note = "x" * 3_000_000
    run = json.dumps({"scheme": STEP, "note": note})
    answer = ask("record", "--from", "-", book=own_book, stdin=run)
    assert answer.status == 0 and len(answer.out) < 2000 and "3,000,000 characters in all" in answer.out
    assert len(ask("show", "4", book=own_book).out) < 30_000
    assert ask("show", "4", "--json", book=own_book).json["note"] == note


@pytest.mark.parametrize("who", ["", "\x1b[31mX", "x" * 1000])
def test_initials_that_are_none_are_refused(small_book: Path, who: str) -> None:
    answer = ask("record", STEP, "--as", who, book=small_book)
    assert answer.status == 2 and is_plain_refusal(answer)


def test_a_cell_of_a_million_characters_is_a_bad_row_not_an_end(tmp_path: Path) -> None:
    table = tmp_path / "steps.csv"
    table.write_text("step\nCCBr\n" + "C" * 999_000 + "\nCCI\n")
    answer = ask("read", "--batch", str(table), "--column", "step")
    assert answer.status == 1
    assert [json.loads(line)["ok"] for line in answer.out.splitlines()] == [True, False, True]
    table.write_text("step\nCCBr\n" + "C" * 2_000_000 + "\n")
    assert is_plain_refusal(ask("read", "--batch", str(table), "--column", "step"))


@pytest.mark.parametrize(
    "words",
    [
        ("chekc", "CCBr"),
        ("check",),
        ("check", "CCBr", "more"),
        ("check", "CCBr", "--temp"),
        ("check", "CCBr", "--frob", "1"),
        ("check", "CCBr", "--top", "-1"),
        ("check", "CCBr", "--top", "x"),
        ("check", "CCBr", "--fail-on", "awful"),
        ("runs", "--sort", "zzz"),
        ("runs", "--limit", "0"),
        ("runs", "--page", "9" * 25),
        ("--bok", "x", "runs"),
        ("show",),
        ("amend", "1"),
        ("rule",),
    ],
)
def test_wrong_usage_ends_with_2_and_one_sentence(small_book: Path, words: tuple[str, ...]) -> None:
    answer = ask(*words, book=small_book)
    assert answer.status == 2 and is_plain_refusal(answer)
    assert "Value error" not in answer.err and "Input should be" not in answer.err
    assert ask(*words, "--json", book=small_book).error["code"] == "usage"


@pytest.mark.parametrize("place", ["", "nonsense://x", "x" * 5000, "a\x00b", "\x1b[31m", "/dev/null"])
def test_a_place_that_holds_no_book_ends_with_4_or_2(place: str) -> None:
    answer = ask("runs", "--book", place)
    assert answer.status == (2 if not place else 4) and is_plain_refusal(answer)


def test_texts_fit_a_narrow_terminal_too(small_book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    commands = (("check", STEP, "--temp", "80C", "--acid", "HCl"), ("show", "1"), ("runs",), ("find",), ("read", STEP))
    for columns, most in (("200", 80), ("60", 60), ("20", 40), ("0", 80), ("nonsense", 80)):
        monkeypatch.setenv("COLUMNS", columns)
        for words in commands:
            assert widest(ask(*words, book=small_book).out) <= most, (columns, words)
