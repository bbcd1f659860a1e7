"""`find` and `lookup`: keys, every criterion, pages, and that nothing unknown goes unsaid."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.asking import ask, is_plain_refusal, widest

BOC = "C(=O)OC(C)(C)C"


def test_an_answer_has_the_keys_of_the_contract(demo_book: Path) -> None:
    said = ask("find", "--substructure", BOC, "--limit", "3", "--json", book=demo_book).json
    assert set(said) >= {"total", "page", "items", "elapsed_ms"}
    assert len(said["items"]) == 3 < said["total"]
    for item in said["items"]:
        assert set(item) >= {"run", "score", "matched"}
        assert set(item["matched"]) >= {"component", "atoms"} and len(item["matched"]["atoms"]) == 7


@pytest.mark.parametrize(
    "words",
    [
        ("--substructure", BOC),
        ("--substructure", BOC, "--role", "substrate"),
        ("--similar", "CCC(C)Br", "--at-least", "0.3"),
        ("--transformation", "[C:1]Br>>[C:1]N"),
        ("--words", "emulsion"),
        ("--solvent", "DMF"),
        ("--base", "K2CO3"),
        ("--temp-from", "80C"),
        ("--temp-to", "0C"),
        ("--failed", "elimination"),
        ("--verdict", "failed"),
        ("--carbon-class", "tertiary"),
        ("--leaving-group", "tosylate"),
        ("--since", "2025-01-01"),
        ("--solvent", "DMF", "--failed", "elimination", "--carbon-class", "secondary"),
    ],
)
def test_every_criterion_narrows_the_book(demo_book: Path, words: tuple[str, ...]) -> None:
    everything = ask("find", "--limit", "1", "--json", book=demo_book).json["total"]
    said = ask("find", *words, "--limit", "5", "--json", book=demo_book).json
    assert 0 < said["total"] < everything
    assert len(said["items"]) == min(5, said["total"])


def test_the_exact_structure_of_a_run_finds_that_run(demo_book: Path) -> None:
    substrate = ask("show", "158", "--json", book=demo_book).json["scheme"].split(">")[0]
    found = ask("find", "--exact", substrate, "--json", book=demo_book).json["items"]
    assert "R-0158" in {item["run"] for item in found}


def test_what_a_criterion_says_is_so(demo_book: Path) -> None:
    hot = ask("find", "--solvent", "DMF", "--temp-from", "80C", "--limit", "8", "--json", book=demo_book).json
    for item in hot["items"]:
        run = ask("show", item["run"], "--json", book=demo_book).json
        assert any(s["smiles"] == "CN(C)C=O" for s in run["conditions"]["solvents"])
        temperature = run["conditions"]["temperature"]
        assert max(temperature["start_c"], temperature["end_c"]) >= 80
    for item in ask("find", "--failed", "emulsion", "--json", book=demo_book).json["items"]:
        run = ask("show", item["run"], "--json", book=demo_book).json
        assert "emulsion" in {f["mode"] for f in run["outcome"]["failures"]}


def test_pages_do_not_overlap_and_one_beyond_the_end_is_empty(demo_book: Path) -> None:
    pages = [
        {i["run"] for i in ask("find", "--limit", "50", "--page", str(n), "--json", book=demo_book).json["items"]}
        for n in (1, 2)
    ]
    assert len(pages[0]) == len(pages[1]) == 50 and not pages[0] & pages[1]
    beyond = ask("find", "--page", "5000", "--json", book=demo_book)
    assert beyond.status == 0 and beyond.json["items"] == [] and beyond.json["total"] > 0


def test_an_unknown_name_is_said_not_taken_for_no_match(demo_book: Path) -> None:
    answer = ask("find", "--solvent", "dmff", book=demo_book)
    assert answer.status == 0
    assert "No run fits" in answer.out and "dmff" in answer.err
    assert "dmff" in str(ask("find", "--solvent", "dmff", "--json", book=demo_book).json)


@pytest.mark.parametrize(
    ("words", "status"),
    [
        (("--substructure", "[C"), 1),
        (("--substructure", ""), 1),
        (("--similar", "zz"), 1),
        (("--exact", "C1"), 1),
        (("--transformation", "CBr"), 1),
        (("--words", '"'), 1),
        (("--temp-from", "hot"), 1),
        (("--temp-from", "80C", "--temp-to", "60C"), 1),
        (("--failed", "zzz"), 1),
        (("--role", "zzz"), 1),
        (("--since", "yesterday"), 1),
        (("--verdict", "zzz"), 2),
        (("--carbon-class", "zzz"), 2),
        (("--leaving-group", "zzz"), 2),
        (("--limit", "0"), 2),
        (("--page", "0"), 2),
        (("--page", "9" * 30), 2),
        (("--at-least", "7"), 2),
    ],
)
def test_a_criterion_that_cannot_be_searched_is_refused(demo_book: Path, words: tuple[str, ...], status: int) -> None:
    answer = ask("find", *words, book=demo_book)
    assert answer.status == status and is_plain_refusal(answer)
    assert set(ask("find", *words, "--json", book=demo_book).error) == {"code", "message", "hint"}


def test_the_text_fits_the_terminal(demo_book: Path) -> None:
    text = ask("find", "--words", "emulsion", book=demo_book).out
    assert widest(text) <= 80 and "of 4 runs" in text


@pytest.mark.parametrize(
    ("name", "match"),
    [
        ("KOtBu", "potassium tert-butoxide"),
        ("t-BuOK", "potassium tert-butoxide"),
        ("K2CO3", "potassium carbonate"),
        ("TFA", "trifluoroacetic acid"),
        ("DIPEA", "N,N-diisopropylethylamine"),
        ("NaN3", "sodium azide"),
        ("DMF", "N,N-dimethylformamide"),
        ("2-MeTHF", "2-methyltetrahydrofuran"),
        ("CN(C)C=O", "N,N-dimethylformamide"),
    ],
)
def test_lookup_knows_the_names_that_chemists_write(name: str, match: str) -> None:
    said = ask("lookup", name, "--json").json
    assert said["match"]["name"] == match and said["match"]["source"]


def test_lookup_offers_near_names_and_takes_none() -> None:
    answer = ask("lookup", "potasium tert-butoxide", "--json")
    assert answer.status == 0 and answer.json["match"] is None
    assert answer.json["offers"][0]["name"] == "potassium tert-butoxide"
    assert set(answer.json["offers"][0]) == {"name", "kind", "score"}


def test_lookup_of_one_kind_says_where_the_name_is_instead() -> None:
    assert ask("lookup", "DMF", "--kind", "solvent", "--json").json["match"]["kind"] == "solvent"
    said = ask("lookup", "DMF", "--kind", "reagent", "--json").json
    assert said["match"] is None and said["also"] == [{"name": "N,N-dimethylformamide", "kind": "solvent"}]
    assert ask("lookup", "DMF", "--kind", "poison").status == 1


def test_lookup_of_nothing_like_a_name_is_refused() -> None:
    answer = ask("lookup", "zzzzzzz", "--json")
    assert answer.status == 1 and is_plain_refusal(answer)
    assert answer.json["match"] is None and answer.json["error"]["code"] == "name-unknown"


def codes(*words: str, book: Path) -> set[str]:
    return {item["run"] for item in ask("find", "--limit", "1000", "--json", *words, book=book).json["items"]}


def test_and_or_and_not_combine_as_sets_do(demo_book: Path) -> None:
    dmf, dmso, bromide = (
        codes(*words, book=demo_book)
        for words in (("--solvent", "DMF"), ("--solvent", "DMSO"), ("--leaving-group", "bromide"))
    )
    assert dmf and dmso and bromide & dmf
    either = codes("--any-of", "solvent=DMF", "--any-of", "solvent=DMSO", book=demo_book)
    assert either == dmf | dmso
    assert codes("--any-of", "solvent=DMF and leaving-group=bromide", book=demo_book) == dmf & bromide
    assert codes("--solvent", "DMF", "--none-of", "leaving-group=bromide", book=demo_book) == dmf - bromide


def test_a_rooted_search_asks_at_the_centre_and_not_elsewhere(demo_book: Path) -> None:
    anywhere = codes("--substructure", "[CX4]OS(C)(=O)=O", "--role", "substrate", book=demo_book)
    rooted = codes("--at-centre", "[CX4:1]OS(C)(=O)=O", book=demo_book)
    assert rooted and rooted <= anywhere
    for code in sorted(rooted)[:5]:
        reading = ask("read", ask("show", code, "--json", book=demo_book).json["scheme"], "--json").json
        assert reading["centres"][0]["leaving_group"] == "mesylate"
    assert not codes("--at-centre", "[c:1]", "--leaving-group", "mesylate", book=demo_book)


def test_pages_in_each_order_hold_every_run_once(demo_book: Path) -> None:
    everything = codes(book=demo_book)
    for order in ("best", "newest", "oldest", "code"):
        met: list[str] = []
        for page in range(1, 8):
            said = ask("find", "--order", order, "--limit", "70", "--page", str(page), "--json", book=demo_book).json
            met += [item["run"] for item in said["items"]]
        assert len(met) == len(set(met)) and set(met) == everything
        if order == "code":
            assert met == sorted(met, key=lambda code: int(code[2:]))


def test_a_deadline_that_cannot_be_meant_is_refused(demo_book: Path) -> None:
    assert ask("find", "--substructure", "C", "--deadline", "0", book=demo_book).status == 2


@pytest.mark.parametrize(
    "smarts",
    [
        "*~*~*~*~*~*",
        "[$(*~[$(*~[$(C~[N,O])])])]",
        "C" * 200,
        "~".join("*" * 30),
        "*1~*~*~*~*~*~1",
        "[!#1]" * 12,
        "[$(*~*~*~*)]~[$(*~*~*~*)]",
    ],
)
def test_open_queries_are_answered_within_the_deadline_or_say_that_they_were_not(demo_book: Path, smarts: str) -> None:
    said = ask("find", "--substructure", smarts, "--deadline", "20", "--json", book=demo_book)
    assert said.status == 0
    assert said.json["complete"] or "deadline" in " ".join(said.json["notes"])


@pytest.mark.parametrize(
    ("smarts", "word"), [("C" * 260, "250"), ("[$(" * 7 + "C" + ")]" * 7, "deep"), ("C(" * 50, "SMARTS")]
)
def test_queries_beyond_bounds_are_refused_in_words(demo_book: Path, smarts: str, word: str) -> None:
    said = ask("find", "--substructure", smarts, "--json", book=demo_book)
    assert said.status == 1 and said.error["code"] == "query"
    assert word in said.error["message"] + said.error["hint"]
