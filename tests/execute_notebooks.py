"""Run all notebooks in place and keep the outputs of the cells that nbval compares.

    .venv/bin/python tests/execute_notebooks.py

A cell tagged `nbval-check-output` without a stored output would pass unseen, so the outputs of
those cells are committed, and of no others; nbval wants their execution counts too.
"""

from pathlib import Path

import nbformat
from nbclient import NotebookClient

NOTEBOOKS = Path(__file__).parent.parent / "notebooks"


def main() -> None:
    for path in sorted(NOTEBOOKS.glob("*.ipynb")):
        notebook = nbformat.read(path, as_version=4)
        NotebookClient(notebook, kernel_name="python3",
                       resources={"metadata": {"path": str(NOTEBOOKS)}}).execute()
        for cell in notebook.cells:
            if cell.cell_type == "code":
                cell.metadata.pop("execution", None)
                if "nbval-check-output" not in cell.metadata.get("tags", []):
                    cell.outputs, cell.execution_count = [], None
        notebook.metadata = {
            "kernelspec": {"display_name": "Python 3", "language": "python", "name": "python3"},
            "language_info": {"name": "python"}}
        nbformat.write(notebook, path)


if __name__ == "__main__":
    main()
