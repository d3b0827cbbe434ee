"""The rules of the inputs: one check_* per rule, each giving its faults or suspicions in sentences."""
