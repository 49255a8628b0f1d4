"""The joined script: names kept apart, one module without imports."""

import re
from collections import Counter

from pathaudit.report.script import MODULES, joined_modules

DECLARED = re.compile(r"^(?:export )?(?:default )?(?:async )?(?:function|class) +(\w+)|^(?:export )?(?:const|let) (.*)", re.MULTILINE)


def declared(script):
    """Names that stand at the top level: what begins a line."""
    for function, constants in DECLARED.findall(script):
        yield from [function] if function else re.findall(r"(?:^|, )(\w+) = ", constants)


def test_no_two_modules_declare_one_name():
    counts = Counter(declared(joined_modules()))
    assert {"render", "mount", "unpack", "theme"} <= set(counts)
    assert [name for name, count in counts.items() if count > 1] == []


def test_joining_leaves_no_import_and_one_export():
    script = joined_modules()
    assert not re.search(r"^import ", script, re.MULTILINE)
    assert re.findall(r"^export .*", script, re.MULTILINE) == ["export default { render };"]
    assert MODULES[-1] == "widget"
