"""Published and closed-form values, each through the public path: study text, system, modes or ring.

The values, their sources and whether a source was quoted from memory stand in cases.json.
"""

import pytest

from tests.references.common import BUILDERS, ENTRIES, results
from tests.references.families import FAMILIES, family_of


def test_every_entry_of_the_data_file_is_run():
    assert set(BUILDERS) == set(ENTRIES)
    assert {family_of(name) for name in ENTRIES} == set(FAMILIES)


@pytest.mark.parametrize("name", ENTRIES)
def test_reference(name):
    checks = results(name)
    assert checks
    wrong = [check for check in checks if not check.agrees]
    assert not wrong, "\n".join(
        f"{check.what}: {check.ours:.10g} for {check.reference:.10g}, difference {check.difference:.2e}"
        for check in wrong
    )
    uncovered = [check for check in checks if not check.covered]
    assert not uncovered, "\n".join(
        f"{check.what}: {check.ours:.10g}, for {check.reference:.10g}, error bar {check.error_bar:.2e}"
        for check in uncovered
    )


@pytest.mark.parametrize("name", ENTRIES)
def test_an_entry_names_its_source(name):
    entry = ENTRIES[name]
    assert entry["source"]
    assert isinstance(entry["from_memory"], bool)
