#!/bin/bash
# The job after the array: joins the parts in DIR and writes the result there. It runs also where a task failed, because 'gather' itself
# names what is missing and how to make it. PANELCHOICE names the program.
#
#     sbatch gather.sh DIR
#SBATCH --job-name=panelchoice-gather
#SBATCH --open-mode=append
set -euo pipefail
folder=$1
program=${PANELCHOICE:-panelchoice}
case $program in *.dll) run=(dotnet "$program") ;; *) run=("$program") ;; esac
exec "${run[@]}" gather "$folder" --threads "${SLURM_CPUS_PER_TASK:-1}"
