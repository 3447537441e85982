rule analyse:
    """Diagnostics against thresholds, onsets, fits; the tables and the list of failures."""
    input:
        jobs=summaries,
        campaign="plan/campaign.yaml",
    output:
        "tables/points.csv",
        "failures.csv",
    log:
        "logs/analyse.log",
    benchmark:
        "benchmarks/analyse.tsv"
    resources:
        mem_mb=4000,
        runtime=30,
    params:
        physics_version=PLAN["physics_version"],
    shell:
        f"{PYTHON} {SCRIPTS}/analyse.py --results . --campaign {CAMPAIGN} > {{log}} 2>&1"
