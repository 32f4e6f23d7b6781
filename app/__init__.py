"""Stonechat: meteoroid-stream hazard, satellite by satellite. Start reading at ``pipeline.py``."""

__version__ = "0.1.0"
