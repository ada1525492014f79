"""What a wire does in foam, outside any job."""

from cutblock.schedule.wire_report import WireReport, wire_report, wire_report_values

__all__ = ["WireReport", "wire_report", "wire_report_values"]
