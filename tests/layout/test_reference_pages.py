"""The reference pages are those of the tables, and say everything."""

from pathlib import Path

from shared_protocol import messages, words
from shared_protocol.settings_table import SETTINGS
from sim.layout import keys
from sim.layout.reading import REQUIRED, Key, key_table_markdown
from sim.reference_pages import layout_page, main, pages, write
from tests.layout.files import load_text

FOLDER = Path(__file__).parent.parent.parent / "docs" / "reference"


def test_the_pages_are_up_to_date() -> None:
    there = {path.name: path.read_text(encoding="utf-8") for path in FOLDER.glob("*.md")}
    made = pages()
    stale = sorted(name for name in made if there.get(name) != made[name])
    assert not stale, f"run: python -m sim.reference_pages docs/reference (stale: {', '.join(stale)})"


def test_every_key_field_word_and_fault_stands_in_its_page() -> None:
    made = pages()
    for _, _, table in keys.TABLES:
        for key in table:
            assert f"| `{key.name}` | {key.sentence} |" in made["layout-file.md"]
    for message in SETTINGS:
        assert f"## {message.name}\n" in made["settings.md"]
        assert all(f"| `{field.key}` | {field.text} |" in made["settings.md"] for field in message.fields)
    for message in (*messages.TO_BOARD, *messages.TO_HOST):
        assert f"### {message.name}\n" in made["messages.md"]
    assert all(f"| `{word}` |" in made["messages.md"] for word in words.REASONS)
    assert all(f"| {number} | `{word}` |" in made["faults.md"] for number, word in enumerate(words.FAULTS) if number)


def test_the_layout_that_the_page_shows_is_right(tmp_path: Path) -> None:
    text = layout_page().split("```toml\n")[1].split("```")[0]
    assert load_text(tmp_path, text).warnings == []


def test_tables_in_markdown_have_as_many_cells_as_headings() -> None:
    for text in pages().values():
        width = 0
        for line in text.split("\n"):
            if line.startswith("|"):
                cells = line.count("|")
                width = width or cells
                assert cells == width, line
            else:
                width = 0


def test_a_row_of_a_table_of_keys() -> None:
    table = (
        Key("full_v", "number", "Full.", None, 3, 33.5, "V"),
        Key("kind", "word", "Kind.", "a", words=("a", "b")),
        Key("name", "text", "Name.", REQUIRED, 1, 24),
        Key("on", "yes/no", "On.", True),
        Key("pins", "list of whole numbers", "Pins.", [], 2, 2),
        Key("wait_ms", "whole", "Wait.", 5000, 0, 60_000, "ms"),
    )
    assert key_table_markdown(table).split("\n")[2:] == [
        "| `full_v` | Full. | number | 3 to 33.5 V |  |",
        "| `kind` | Kind. | word | `a`, `b` | a |",
        "| `name` | Name. | text | 1 to 24 characters | must be given |",
        "| `on` | On. | yes/no |  | true |",
        "| `pins` | Pins. | list of whole numbers | 2 entries |  |",
        "| `wait_ms` | Wait. | whole | 0 to 60 000 ms | 5000 |",
        "",
    ]


def test_write_makes_the_folder(tmp_path: Path) -> None:
    written = write(tmp_path / "new" / "pages")
    assert {path.name: path.read_text(encoding="utf-8") for path in written} == pages()
    assert main([]) == 2
