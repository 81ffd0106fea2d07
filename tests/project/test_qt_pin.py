"""The pinned PySide6 keeps the references of None; a version that loses them kills the process in time."""

import sys

from PySide6.QtCore import Qt
from PySide6.QtGui import QColor, QImage, QPainter, QPen


def test_painting_loses_no_reference_of_none():
    image = QImage(8, 8, QImage.Format.Format_ARGB32_Premultiplied)
    pen = QPen(QColor(Qt.GlobalColor.black))
    painter = QPainter(image)
    before = sys.getrefcount(None)
    for _ in range(2000):
        painter.setPen(pen)
    fell = before - sys.getrefcount(None)
    painter.end()
    assert fell < 100
