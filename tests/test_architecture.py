"""The house keeps its order: who may import whom, and how long a module may grow.

Truth is the plan in DEVELOPERS.md. Every check is also shown to fail on a planted breach.
"""

from __future__ import annotations

import ast
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
GROUND = ("quantity", "findings", "weave", "tone", "errors")
ORDER = (
    *("picture", "repeat", "scale", "threads", "cover", "cloth", "verdict"),
    *("ledger", "report", "request", "asking", "inspection", "audit", "plan", "cli"),
)
LOOM_MAY = {*GROUND, "cloth", "loom"}
LOOM_FOR = {"plan", "cli", "loom"}
LONGEST = 350
"""Lines: what one sitting can hold in the head."""
LIGHT_INITS = {"cli"}
"""The one room whose `__init__` does something: it is the entry point."""
NO_PRINT_OUTSIDE = "cli"
BANNED_NAMES = {"utils", "util", "common", "helpers", "helper", "misc", "base", "manager"}


def modules(root: Path) -> list[Path]:
    return sorted((root / "imgcover").rglob("*.py"))


def room_of(path: Path, root: Path) -> str:
    return path.relative_to(root / "imgcover").parts[0].removesuffix(".py")


def imported_rooms(tree: ast.AST) -> Iterator[str]:
    """Name the room of every import of our own, wherever in the file it stands."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            if node.level:
                yield "relative"
                continue
            module = node.module or ""
            names = (
                [f"imgcover.{alias.name}" for alias in node.names]
                if module == "imgcover"
                else [module]
            )
        else:
            continue
        for name in names:
            if name.startswith("imgcover."):
                yield name.split(".")[1]


def allowed(room: str) -> set[str]:
    everyone = {*GROUND, "__version__", room}
    if room in GROUND:
        return {*GROUND, "__version__"}
    if room == "loom":
        return LOOM_MAY
    if room in ("__init__", "__main__"):
        return {"cli"}
    before = set(ORDER[: ORDER.index(room)])
    return everyone | before | ({"loom"} if room in LOOM_FOR else set())


def breaches(root: Path) -> list[str]:
    """Say what breaks the plan of the house, one line a breach."""
    said = []
    for path in modules(root):
        text = path.read_text(encoding="utf-8")
        tree = ast.parse(text)
        name, room = str(path.relative_to(root)), room_of(path, root)
        if len(text.splitlines()) > LONGEST:
            said.append(f"{name}: longer than {LONGEST} lines")
        if room not in {*GROUND, *ORDER, "loom", "__init__", "__main__"}:
            said.append(f"{name}: not a room of the plan")
            continue
        if BANNED_NAMES & {part.removesuffix(".py") for part in path.relative_to(root).parts}:
            said.append(f"{name}: a name that says nothing")
        said += [
            f"{name}: imports {other}"
            for other in sorted(set(imported_rooms(tree)) - allowed(room))
        ]
        if path.name == "__init__.py" and path.parent.name not in {*LIGHT_INITS, "imgcover"}:
            heavy = [node for node in tree.body if not isinstance(node, ast.Expr)]
            said += [f"{name}: holds more than its docstring"] if heavy else []
        if room != NO_PRINT_OUTSIDE and any(
            isinstance(node, ast.Call)
            and isinstance(node.func, ast.Name)
            and node.func.id == "print"
            for node in ast.walk(tree)
        ):
            said.append(f"{name}: prints")
    return said


def test_the_house_keeps_its_order() -> None:
    assert breaches(ROOT) == []


def test_no_test_module_is_too_long() -> None:
    long = [
        str(path.relative_to(ROOT))
        for path in sorted((ROOT / "tests").rglob("*.py"))
        if len(path.read_text(encoding="utf-8").splitlines()) > LONGEST
    ]
    assert long == []


@pytest.mark.parametrize(
    ("where", "text", "breach"),
    [
        ("threads/x.py", "from imgcover.cover.reading import A\n", "imports cover"),
        ("picture/x.py", "def f():\n    import imgcover.scale.pitch\n", "imports scale"),
        ("cover/x.py", "from imgcover import loom\n", "imports loom"),
        ("cover/x.py", "from ..scale import pitch\n", "imports relative"),
        ("loom/x.py", "from imgcover.threads.reader import A\n", "imports threads"),
        ("tone.py", "from imgcover.picture.reader import A\n", "imports picture"),
        ("cover/x.py", "A = 1\n" * (LONGEST + 1), f"longer than {LONGEST} lines"),
        ("cover/x.py", "print(1)\n", "prints"),
        ("cover/__init__.py", '"""Cover."""\nimport os\n', "holds more than its docstring"),
        ("cover/utils.py", "A = 1\n", "a name that says nothing"),
        ("attic/x.py", "A = 1\n", "not a room of the plan"),
    ],
)
def test_a_planted_breach_is_seen(tmp_path: Path, where: str, text: str, breach: str) -> None:
    planted = tmp_path / "imgcover" / where
    planted.parent.mkdir(parents=True, exist_ok=True)
    planted.write_text(text, encoding="utf-8")
    assert breaches(tmp_path) == [f"imgcover/{where}: {breach}"]


@pytest.mark.parametrize(
    ("where", "text"),
    [
        ("cover/x.py", "from imgcover.threads.reading import A\nfrom imgcover import findings\n"),
        ("cli/x.py", "from imgcover.loom.drawing import A\n"),
        ("loom/x.py", "from imgcover.cloth.declaration import A\n"),
    ],
)
def test_what_the_plan_allows_is_let_through(tmp_path: Path, where: str, text: str) -> None:
    planted = tmp_path / "imgcover" / where
    planted.parent.mkdir(parents=True, exist_ok=True)
    planted.write_text(text, encoding="utf-8")
    assert breaches(tmp_path) == []
