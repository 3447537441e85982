rule gather:
    """All records of the campaign in one self-describing file."""
    input:
        "tables/points.csv",
    output:
        "campaign.h5",
    log:
        "logs/gather.log",
    benchmark:
        "benchmarks/gather.tsv"
    resources:
        mem_mb=2000,
        runtime=30,
    params:
        physics_version=PLAN["physics_version"],
    shell:
        f"{PYTHON} {SCRIPTS}/gather.py --results . --campaign {CAMPAIGN} > {{log}} 2>&1"
