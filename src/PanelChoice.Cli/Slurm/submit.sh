#!/bin/bash
# Sends a study to Slurm: an array of tasks that make its parts, and a job that gathers them when all tasks have ended.
#
#     submit.sh STUDY PARTS DIR [options for sbatch ...]
#     submit.sh study.toml 16 parts --cpus-per-task=4 --mem=8G --time=2:00:00
#
# Everything goes to DIR: parts, logs, result. Given again, it makes what is missing. The program is the one beside this folder, or
# the one that the variable PANELCHOICE names (an executable, or a .dll for dotnet to run).
set -euo pipefail
if [ $# -lt 3 ] || ! [ "$2" -ge 1 ] 2>/dev/null; then
    echo "usage: submit.sh STUDY PARTS DIR [options for sbatch ...]" >&2
    exit 64
fi
study=$1 parts=$2 folder=$3
shift 3
[ -f "$study" ] || { echo "submit.sh: $study: there is no such study file" >&2; exit 66; }
here=$(dirname "$(readlink -f "${BASH_SOURCE[0]}")")
if [ -z "${PANELCHOICE:-}" ] && [ -f "$here/../PanelChoice.Cli.dll" ]; then
    PANELCHOICE=$(readlink -f "$here/../PanelChoice.Cli.dll")
fi
export PANELCHOICE=${PANELCHOICE:-panelchoice}
mkdir -p "$folder"
array=$(sbatch --parsable --array="1-$parts" --output="$folder/part-%a.log" "$@" "$here/part.sh" "$study" "$parts" "$folder")
array=${array%%;*}
gather=$(sbatch --parsable --dependency="afterany:$array" --output="$folder/gather.log" "$@" "$here/gather.sh" "$folder")
echo "array $array makes $parts parts, job ${gather%%;*} gathers them; everything goes to $folder"
