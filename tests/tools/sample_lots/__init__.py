"""What make_sample_lots.py is built of: part models, truth, simulators, file forms, the scenario."""
