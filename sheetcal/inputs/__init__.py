"""Readers of what people and instruments give: lab file, worklist, analysis, logger and data files."""

from sheetcal.inputs.analysis import AnalysisValue, read_analysis
from sheetcal.inputs.data import DataFile, DataValue, read_data
from sheetcal.inputs.instrument_log import InstrumentReading, read_instrument_log
from sheetcal.inputs.lab import Lab
from sheetcal.inputs.lab_append import append_block, block_text
from sheetcal.inputs.lab_reader import read_lab
from sheetcal.inputs.logger import LoggerRecord, read_logger
from sheetcal.inputs.worklist import Worklist, WorklistSample, read_worklist

__all__ = [
    "AnalysisValue",
    "DataFile",
    "DataValue",
    "InstrumentReading",
    "Lab",
    "LoggerRecord",
    "Worklist",
    "WorklistSample",
    "append_block",
    "block_text",
    "read_analysis",
    "read_data",
    "read_instrument_log",
    "read_lab",
    "read_logger",
    "read_worklist",
]
