"""Pictures as data need no drawing library."""

import subprocess
import sys


def test_views_load_neither_matplotlib_nor_widgets_nor_templates():
    code = "import sys, deembed.views, deembed.views.sentences; print(sorted(sys.modules))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    for name in ("'matplotlib'", "'ipywidgets'", "'skrf'", "'jinja2'"):
        assert name not in done.stdout
