from assess.case.forms import EvidenceEntry, OptionEntry, SectionEntry
from assess.decisions.targets import TARGET_SETS
from assess.vocabulary import vocabulary


def test_every_kind_stands_under_its_own_key() -> None:
    words = vocabulary()
    for forms in (words.evidence, words.limit_states, words.options):
        assert forms
        assert all(key == form.key for key, form in forms.items())
        assert len({form.title for form in forms.values()}) == len(forms)


def test_entries_extend_what_the_case_format_knows() -> None:
    words = vocabulary()
    assert all(issubclass(form.entry, EvidenceEntry) for form in words.evidence.values())
    assert all(issubclass(form.entry, SectionEntry) for form in words.limit_states.values())
    assert all(issubclass(form.entry, OptionEntry) for form in words.options.values())


def test_value_column_of_evidence_exists_and_has_a_unit() -> None:
    for form in vocabulary().evidence.values():
        (value,) = [column for column in form.columns if column.name == form.value]
        assert value.unit is not None
        # A share may be any; dimensions are compared with what the case says of each.
        free = value.unit == "-" or form.key in {"dimensions", "quantities"}
        assert value.usual is not None or free


def test_every_target_class_is_offered() -> None:
    offered = vocabulary().targets
    assert {name: set(classes) for name, classes in offered.items()} == {
        name: set(item.classes) for name, item in TARGET_SETS.items()
    }


def test_grades_are_those_of_all_productions() -> None:
    # JCSS PMC 3.1: ready-mixed C15 to C45, precast C25 to C55.
    assert vocabulary().concrete_grades == ("C15", "C25", "C35", "C45", "C55")
