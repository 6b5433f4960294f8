"""Workbooks looked at together: copies, times, firings, controls, habits. It works on small summaries alone."""
