//! What an earlier, unfinished run has left: whether it is this very run, and its points one after the other.

use super::blocks::{BlockCache, PointPlace};
use super::claim::Held;
use super::encoding::BlockPlace;
use super::error::ArchiveError;
use super::layout::Digest;
use super::model::RunHeader;
use super::reader::{Archive, Bytes, Source};
use super::stored::{Sweep, read_block};
use super::sweep::{Point, Share};

/// Why the run that left this archive is not the one that begins now; nothing when it is.
///
/// Of inputs and data files those are compared that the run has named so far.
pub(crate) fn another_run(left: &Archive, now: &RunHeader, share: Option<Share>) -> Option<String> {
    let Ok(then) = left.run() else { return Some("the description of its run is damaged".to_owned()) };
    if left.is_finished() {
        return Some("it is a finished archive".to_owned());
    }
    if then.script_name != now.script_name {
        return Some(format!("it belongs to another script, `{}`", then.script_name));
    }
    if then.program_version != now.program_version {
        return Some(format!("it was written by version {}", then.program_version));
    }
    if then.script_text != now.script_text {
        return Some("the script has changed since".to_owned());
    }
    if then.tolerances != now.tolerances {
        return Some("it was solved to other tolerances".to_owned());
    }
    let shares = left.sweeps().iter().filter_map(Sweep::record).map(|record| record.share);
    if let Some(other) = shares.into_iter().find(|other| *other != share) {
        let which = |share: Option<Share>| share.map_or("the whole".to_owned(), |it| format!("part {it}"));
        return Some(format!("it holds {} of its plans, and this run solves {}", which(other), which(share)));
    }
    changed(then, now)
}

/// An input or a data file that is not what it was. One that the earlier run had not come to is no difference: the
/// digest in the description of each sweep tells what its points stand on.
pub(crate) fn changed(then: &RunHeader, now: &RunHeader) -> Option<String> {
    for (name, input) in &now.inputs {
        match then.inputs.get(name) {
            Some(before) if before == input => {}
            // the archive keeps whether the value was set from outside, so this must agree as well
            Some(before) if before.used == input.used => {
                return Some(format!("the input `{name}` was set in another way"));
            }
            Some(before) => {
                return Some(format!("the input `{name}` was {} and is now {}", before.used, input.used));
            }
            None => {}
        }
    }
    for (name, file) in &now.data_files {
        if then.data_files.get(name).is_some_and(|before| before != file) {
            return Some(format!("the data file `{name}` has changed"));
        }
    }
    None
}

/// Whether all that the one says of inputs and data files is said by the other.
pub(crate) fn says_nothing_new(known: &RunHeader, now: &RunHeader) -> bool {
    now.inputs.keys().all(|name| known.inputs.contains_key(name))
        && now.data_files.keys().all(|name| known.data_files.contains_key(name))
}

/// The points of a sweep that an earlier run has stored, without their snapshots, in order of index.
#[derive(Debug)]
pub struct EarlierPoints {
    source: Box<dyn Source>,
    path: std::path::PathBuf,
    run: Digest,
    name: String,
    blocks: Vec<BlockPlace>,
    places: std::vec::IntoIter<PointPlace>,
    cache: BlockCache,
}

impl EarlierPoints {
    /// Those of this sweep that lack nothing.
    pub(crate) fn of(
        held: &Held,
        path: &std::path::Path,
        run: Digest,
        sweep: &Sweep,
    ) -> Result<Self, ArchiveError> {
        let failed = |source| ArchiveError::Io { action: "read", path: path.to_owned(), source };
        let whole = |place: &&PointPlace| !sweep.incomplete.contains(&place.index);
        let places: Vec<PointPlace> = sweep.places.iter().filter(whole).copied().collect();
        Ok(EarlierPoints {
            source: held.source().map_err(failed)?,
            path: path.to_owned(),
            run,
            name: sweep.name.clone(),
            blocks: sweep.blocks.clone(),
            places: places.into_iter(),
            cache: BlockCache::default(),
        })
    }

    /// How many are still to come.
    pub fn count_left(&self) -> usize {
        self.places.len()
    }
}

impl Iterator for EarlierPoints {
    type Item = Result<Point, ArchiveError>;

    fn next(&mut self) -> Option<Self::Item> {
        let place = self.places.next()?;
        let bytes = Bytes { source: &*self.source, path: &self.path };
        let (run, name) = (Some(self.run), &self.name);
        let block = self.blocks.get(place.block as usize)?;
        let read = || read_block(bytes, run, name, block);
        Some(self.cache.get(place.block, read).map(|block| block.point(place.row as usize).point))
    }
}
