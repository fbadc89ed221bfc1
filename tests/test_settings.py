"""Settings: every fault of a file is said at once, by name and with what is allowed; the template is valid itself."""

import tomllib

import pytest

from gley.errors import UsageError
from gley.settings import Settings, load, template


def write(tmp_path, text):
    path = tmp_path / "survey.toml"
    path.write_text(text, encoding="utf-8")
    return path


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("[probes]\nelectrode='SCE'", r"\[probes\] is no group; there are survey, probe"),
        ("[probe]\nelektrode='SCE'", r"elektrode is unknown; did you mean electrode"),
        ("[probe]\nsd_checked_mV='much'", r"sd_checked_mV = 'much': a number is wanted"),
        ("[probe]\nsd_checked_mV=-1", r"at least 0 is wanted"),
        ("[probe]\noffset_mV=nan", r"a number is wanted"),
        ("[stability]\ndraws=20.5", r"a whole number is wanted"),
        ("[stability]\nclear=95", r"0 to 1 is wanted"),
        ("[stability]\nsolids='old'", r"one of fresh, aged, none is wanted"),
        ("[stability]\nelements='As'", r"a list of names is wanted"),
        ("[stability]\nassumed_temperature_C=-300", r"-5 to 100 is wanted"),
        ("[stability]\nassumed_mol_L={SO4=-1}", r"SO4: 0 to 10 is wanted"),
        ("[stability]\nassumed_mol_L={SO4='a'}", r"SO4: a number is wanted"),
        ("[stability]\nassumed_mol_L={sulfat=1e-3}", r"sulfat is no constituent"),
        ("[survey]\ncolumns={a=1}", r"a: text is wanted"),
        ("[chart]\npH_min=9\npH_max=6", r"pH_min = 9 must lie below pH_max = 6"),
        ("[stability]\nlikely=0.99", r"likely = 0.99 must lie below clear"),
        ("[chart]\nfan='no'", r"true or false is wanted"),
        ("not toml", r"not valid TOML"),
    ],
)
def test_faults_are_said(tmp_path, text, says):
    with pytest.raises(UsageError, match=says):
        load(write(tmp_path, text))


def test_all_faults_at_once(tmp_path):
    with pytest.raises(UsageError, match=r"elektrode.*draws"):
        load(write(tmp_path, "[probe]\nelektrode='x'\n[stability]\ndraws='y'"))


def test_command_line_wins_over_the_file(tmp_path):
    path = write(tmp_path, "[probe]\nelectrode='SCE'\nsd_checked_mV=25")
    settings = load(path, probe={"electrode": "SHE"})
    assert settings.probe.electrode == "SHE"
    assert settings.probe.sd_checked_mV == 25


def test_template_is_valid_with_and_without_its_comment_marks(tmp_path):
    assert load(write(tmp_path, template())) == Settings()
    lines = [
        line[1:] if line.startswith("#") and not line.startswith("# ") else line for line in template().splitlines()
    ]
    tomllib.loads("\n".join(lines))
    load(write(tmp_path, "\n".join(lines)))
