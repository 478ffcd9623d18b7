"""Print one of the commands that README.md promises: the fenced block after ``<!-- command: NAME -->``.

    python .ci/readme_command.py test

.ci/run executes what this prints, so that what people read is what is checked.
"""

import re
import sys
from pathlib import Path

README = Path(__file__).parent.parent / "README.md"


def readme_command(name: str, readme: str) -> str:
    """The command under a name, without its fence."""
    found = re.findall(rf"<!-- command: {re.escape(name)} -->\s*```sh\n(.*?)\n```", readme, flags=re.DOTALL)
    if len(found) != 1:
        raise SystemExit(f"README.md has {len(found)} fenced commands under <!-- command: {name} -->; one is needed.")
    return str(found[0])


if __name__ == "__main__":
    print(readme_command(sys.argv[1], README.read_text(encoding="utf-8")))
