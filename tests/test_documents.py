"""The documents keep to the code: tables generated, commands as the continuous checks run them."""

from pathlib import Path

import pytest

from twofluid.quantities import nomenclature_markdown
from twofluid.scenario import key_table_markdown

ROOT = Path(__file__).parent.parent


def between(document, name):
    text = (ROOT / document).read_text()
    return text.split(f"<!-- {name} -->\n")[1].split(f"<!-- end of {name} -->")[0].strip()


@pytest.mark.parametrize(
    ("document", "name", "table"),
    [
        ("README.md", "key table", key_table_markdown),
        ("DEVELOPERS.md", "nomenclature", nomenclature_markdown),
    ],
)
def test_tables_in_the_documents_are_those_of_the_code(document, name, table):
    assert between(document, name) == table().strip()
