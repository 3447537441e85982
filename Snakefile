"""A campaign of bond scans: references along each scan, correlated points in blocks, tables and report.

snakemake --profile config/profiles/local --configfile config/demo.yaml
"""

from snakemake.utils import min_version

min_version("9.0")


include: "workflow/rules/common.smk"


workdir: str(LAYOUT.folder)


include: "workflow/rules/reference.smk"
include: "workflow/rules/correlate.smk"
include: "workflow/rules/fragments.smk"
include: "workflow/rules/gather.smk"
include: "workflow/rules/analyse.smk"
include: "workflow/rules/report.smk"


rule all:
    default_target: True
    input:
        summaries,  # here too: a retry removes some, and the engine makes no lost intermediate file by itself
        "campaign.h5",
        "tables/points.csv",
        "failures.csv",
        "report.html",
        "summary.txt",
    localrule: True


onsuccess:
    print(f"all results are in {LAYOUT.folder}")


onerror:
    for job in missing_jobs():
        print(f"not finished: {job} (see {LAYOUT.folder}/logs/{job}.log)")
    print("starting the same command again computes only what is missing")
