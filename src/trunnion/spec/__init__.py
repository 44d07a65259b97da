"""The project spec: `workbook.yaml`, read strictly, with every fault placed.

from trunnion.spec import load_workbook
workbook = load_workbook("workbooks/sedgewing")
"""

from trunnion.spec.load import load_workbook, workbook_file
from trunnion.spec.model import json_schema
from trunnion.spec.workbook import Workbook

__all__ = ["Workbook", "json_schema", "load_workbook", "workbook_file"]
