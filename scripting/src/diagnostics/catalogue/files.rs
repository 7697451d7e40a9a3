//! E4: files and archives.

super::rows! {
    UNREADABLE = "E400", "a file cannot be read",
        "The file does not exist, may not be read, or is not text in UTF-8 where text is wanted.",
        "epiloom run scenarios/window_and_bsf.rhai";
    OUTSIDE = "E401", "a file outside the script's folder",
        "Scripts read data files only from the folder they lie in and below, and from folders opened by \
         `--allow-read`. Links that lead out of them count as outside.",
        "epiloom run cell.rhai --allow-read measured";
    DATA_FILE = "E402", "a data file that cannot be understood",
        "A line of a data file is not what the reader wants, mostly two numbers separated by a comma. The message \
         names file, line and column.",
        "wavelength_nm,irradiance_W_per_m2_nm\n300,0.00102";
    UNWRITABLE = "E403", "a file cannot be written",
        "The file could not be created or written: the folder does not exist, may not be written, or the disk is \
         full. Nothing that was there before has been changed.",
        "epiloom run cell.rhai --out results/cell.epiloom";
    OUTSIDE_OUTPUT = "E407", "a picture outside the output folder",
        "A script writes pictures into the folder of its archive and below, nowhere else: no absolute path, no `..`, no \
         link that leads out. Folders must be there already.",
        "picture(\"bands.svg\", cell.equilibrium());";
    OTHER_ARCHIVE = "E404", "the archive belongs to another script",
        "A run replaces the earlier archive of the same script, and never another's. The file that would be \
         replaced holds the results of a script of another name, or is no archive at all.",
        "epiloom run cell.rhai --out cell_second.epiloom";
    BUSY = "E405", "another run is writing this archive",
        "The unfinished archive is locked by a run that is still going on. Wait for it, or give this run another \
         name.",
        "epiloom run cell.rhai --out cell_second.epiloom";
    NOT_PARTS = "E406", "archives that are not the parts of one run",
        "`epiloom gather` takes the archives of `epiloom run --part K/N`: all N of them, each once, each finished, of \
         one script with the same inputs, data files and version. The message names what is missing or different.",
        "epiloom gather map.part-*-of-64.epiloom -o map.epiloom";
    NOT_AN_ARCHIVE = "E410", "not an archive",
        "The file does not begin as an archive of Epiloom does. It may be another kind of file, or its beginning may \
         be destroyed.",
        "epiloom show window_and_bsf.epiloom";
    NEWER_ARCHIVE = "E411", "an archive of a newer format",
        "The archive was written by a newer version of Epiloom, in a format this one does not know. It is not read \
         in part, since that could give wrong numbers.",
        "epiloom --version";
    TORN_ARCHIVE = "E412", "the archive is cut off",
        "The file ends within a frame: the run that wrote it was killed, the disk was full, or the copy was not \
         complete. All whole frames before the cut are shown; what follows is lost.",
        "epiloom run cell.rhai      # run it again";
    DAMAGED_FRAME = "E413", "a frame of the archive is damaged",
        "The checksum of a frame does not fit its bytes, so it is refused: no number of it is shown. Frames beside \
         it stay readable.",
        "epiloom export cell.epiloom \"dark J-V\" --to csv -o dark.csv";
    UNKNOWN_SNAPSHOT = "E414", "no snapshot of this name",
        "The archive holds no snapshot of this name. `epiloom show FILE` lists all.",
        "epiloom show window_and_bsf.epiloom \"light J-V\"";
    NOT_EXPORTABLE = "E415", "the snapshot cannot be written in this format",
        "The format holds columns of numbers, and the snapshot has none. JSON takes every snapshot.",
        "epiloom export cell.epiloom \"note\" --to json -o note.json";
    NO_PICTURE = "E416", "no such picture",
        "The snapshot does not hold what the chart shows, the table has no such column, a scale or range does not fit \
         the data, snapshots of different kinds were to be laid over each other, or the file's ending is not .svg, \
         .png or .pdf. The message says which, and what there is.",
        "epiloom plot window_and_bsf.epiloom \"light J-V\" -o light.svg";
    REPLAY_DIFFERS = "E420", "the replay differs",
        "The archived script was run again and gave other numbers. With the same version of Epiloom that must not \
         happen on any machine; with another version the difference shows what changed. The message lists the first \
         differences.",
        "epiloom replay window_and_bsf.epiloom";
    REPLAY_INPUT = "E421", "a data file changed since the archive was written",
        "The script reads a data file whose content is not what the archive recorded, or which is gone, so the \
         replay would answer another question.",
        "epiloom replay cell.epiloom --data scripts";
    UNKNOWN_CODE = "E430", "unknown code",
        "`epiloom explain` takes a code as printed in brackets in a message; without a code it lists all.",
        "epiloom explain E210";
}
