"""What stands round the views: menu row, stage line, status line, notices, and how the body is laid."""
