"""One leaf at one moment: photosynthesis, stomata and leaf temperature, solved together."""
