"""What is shown when there is no survey, or something is wrong: ways to begin, problems of a folder, failures."""
