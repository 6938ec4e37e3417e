"""The code blocks of the README.

python tests/readme.py N          prints the N-th shell command, counted from 1, as it stands there
"""

import re
import sys
from pathlib import Path

README = Path(__file__).parents[1] / "README.md"


def blocks(language):
    """The text of each fenced block of a language, in order."""
    return re.findall(rf"^```{re.escape(language)}\n(.*?)^```$", README.read_text(), re.DOTALL | re.MULTILINE)


if __name__ == "__main__":
    try:
        (number,) = map(int, sys.argv[1:])
        print(blocks("sh")[number - 1], end="")
    except (ValueError, IndexError):
        sys.exit(__doc__)
