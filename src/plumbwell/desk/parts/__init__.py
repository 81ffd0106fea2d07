"""Small parts that many widgets share: action words, captions, fields, icons, tool tips."""
