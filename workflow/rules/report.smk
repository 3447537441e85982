rule report:
    """Pictures of all scans and the page to look at."""
    input:
        "tables/points.csv",
    output:
        "report.html",
        "summary.txt",
    log:
        "logs/report.log",
    benchmark:
        "benchmarks/report.tsv"
    resources:
        mem_mb=4000,
        runtime=30,
    params:
        physics_version=PLAN["physics_version"],
    shell:
        f"{PYTHON} {SCRIPTS}/report.py --results . --campaign {CAMPAIGN} > {{log}} 2>&1"
