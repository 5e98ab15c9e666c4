"""The files of `panelkit price --out`: pictures, their numbers, a spreadsheet."""

from pathlib import Path

from panelkit.records import PriceAnswer
from panelkit.report import draw_prices, price_workbook
from panelkit.runtime import json_bytes, write_whole
from panelkit.workflow.price_content import price_content

__all__ = ["write_prices"]


def write_prices(answer: PriceAnswer, out: Path, *, workbook: bool = True) -> list[str]:
    """Write what an answer gives rise to, and return the names of the files.

    Parameters
    ----------
    answer : PriceAnswer
        Priced scenarios.
    out : Path
        The folder; it is made, and files of the same names are replaced.
    workbook : bool
        Whether to write the spreadsheet.

    Returns
    -------
    list of str
        Relative to the folder, in the order written.

    Raises
    ------
    RunFolderError
        A file cannot be written, or openpyxl is missing.
    """
    files: dict[str, bytes] = {}
    if workbook:
        files["cost.xlsx"] = price_workbook(tuple(s.sheet for s in answer.scenarios))
    files["price.json"] = json_bytes(price_content(answer))
    for picture in draw_prices(answer):
        files[f"{picture.name}.svg"] = picture.svg
        files[f"{picture.name}.csv"] = picture.table
    for name, content in files.items():
        with write_whole(out / name) as file:
            file.write(content)
    return list(files)
