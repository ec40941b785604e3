import tomllib

from tidescour.plan.lines import key_marks

TEXT = """\
[site]
name = "a"
[[stage]]
name = "one"
[[stage.opening]]
name = "x"
[[stage.opening]]
name = "y"
[[stage]]  # the second
name = "two"
[[stage.opening]]
name = "x"
[protection.basin.opening."the shoal"]
bed_level_m = -3
[records.sea]
exclude = [
  ["[site]"],
  [ "name = 1" ],
]
text = '''
[site]
name = "b"
[[stage]]
'''
clock.zone = "c"
'quoted' = 1
"""


def test_keys_stand_where_they_are_written():
    marks = {path: mark.number for path, mark in key_marks(TEXT, tomllib.loads(TEXT), "plan.toml").items()}
    assert marks["site",] == 1
    assert marks["site", "name"] == 2
    assert marks["stage", 0, "opening", 1, "name"] == 8
    assert marks["stage", 1] == 9
    assert marks["stage", 1, "opening", 0] == 11
    assert marks["protection", "basin", "opening", "the shoal"] == 13
    assert marks["protection", "basin"] == 13
    assert marks["protection", "basin", "opening", "the shoal", "bed_level_m"] == 14
    assert marks["records", "sea", "exclude"] == 16
    assert ("stage", 2) not in marks


def test_a_mark_reads_as_file_and_line():
    assert str(key_marks("a = 1\r\n", {"a": 1}, "plan.toml")["a",]) == "plan.toml line 1"
